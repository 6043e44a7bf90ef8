"""A field sent to another process is the same field, frozen."""

import pickle

import numpy as np
import pytest

from fieldview.compute.error_model import ErrorModel, Systematic
from fieldview.compute.field import Event, Field, Status
from fieldview.compute.grid import Grid, Placement


def test_a_field_survives_the_way_to_another_process():
    rng = np.random.default_rng(1)
    grid = Grid(np.arange(5.0), np.arange(4.0), Placement(factor=1j, shift=2 + 0j))
    nodes = rng.random(grid.shape) < 0.3
    error = ErrorModel(
        sigma={"u": 0.1, "v": rng.random(grid.shape)}, origin="given", systematic=Systematic(scale=0.01)
    )
    field = Field(
        grid,
        u=rng.normal(size=grid.shape),
        v=rng.normal(size=grid.shape),
        channels={"peak_ratio": rng.random(grid.shape)},
        channel_units={"peak_ratio": "1"},
        time=0.4,
        error=error,
        notes=("a note",),
    ).reject(nodes, Event(0, "median_test", "rejected", nodes))
    again = pickle.loads(pickle.dumps(field))
    assert (again.status == field.status).all() and (again.status == Status.REJECTED).sum() == nodes.sum()
    for name in ("u", "v"):
        assert np.array_equal(getattr(again, name), getattr(field, name), equal_nan=True)
        assert np.array_equal(again.measured[name], field.measured[name])
    assert np.array_equal(again.channels["peak_ratio"], field.channels["peak_ratio"])
    assert again.grid.same_nodes(grid) and again.time == 0.4 and again.notes == field.notes
    assert again.error.systematic == error.systematic and np.array_equal(
        again.error.sigma["v"], error.sigma["v"]
    )
    assert again.events[0].step == "median_test" and again.units == field.units
    with pytest.raises(ValueError, match="read-only"):
        again.u[0, 0] = 1.0
    with pytest.raises(TypeError):
        again.error.sigma["u"] = 2.0
