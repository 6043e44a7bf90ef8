"""Modes and two-point correlation of a session's run."""

import json

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.compute.grid import Grid
from fieldview.session import modes as run_modes_module
from fieldview.session.modes import node_areas, run_modes, two_point
from tests.session.test_traces import street


def test_a_travelling_wave_is_two_modes_of_like_energy():
    bench = street(count=60, sigma=0.004, missing=0.15)
    found = run_modes(bench, count=4)
    shares = found.modes.shares
    # the wave's energy is 0.05^2/2 per node beside twice the noise variance
    wave = 0.05**2 / 2 / (0.05**2 / 2 + 2 * 0.004**2)
    assert shares[0] + shares[1] == pytest.approx(wave, rel=0.03) and shares[2] < 0.01
    rows = found.rows()
    assert json.loads(json.dumps(rows, allow_nan=False)) == rows
    assert [row["mode"] for row in rows] == [1, 2, 3, 4] and rows[1]["cumulative"] == pytest.approx(
        wave, rel=0.03
    )
    assert any("15" in remark and "2 modes" in remark for remark in found.remarks())
    rebuilt = found.reconstruction(7, count=2)
    truth = street(count=60, sigma=0.0, missing=0.0).field(7)
    assert np.sqrt(np.mean((rebuilt.v - truth.v) ** 2)) < 0.004
    first = found.mode_field(1)
    assert np.sqrt(np.mean(first.v**2)) == pytest.approx(np.sqrt(found.modes.energies[0] / 600), rel=0.1)
    assert first.error.sigma is None and "mode 1 with" in first.notes[0]
    with pytest.raises(InputError, match="mode 5 does not exist; the modes are 1 to 4"):
        found.mode_field(5)
    with pytest.raises(InputError, match="frame 99 is not among"):
        found.reconstruction(99)


def test_frames_that_do_not_fit_are_refused_with_a_number_that_does(monkeypatch):
    monkeypatch.setattr(run_modes_module, "MOST_BYTES", 600 * 2 * 8 * 12)
    with pytest.raises(InputError, match="choose at most 12, such as every 4th"):
        run_modes(street(count=48))
    assert len(run_modes(street(count=48), "0:48:4").frames) == 12


def test_areas_of_nodes_add_up_to_the_grid():
    rng = np.random.default_rng(1)
    grid = Grid(np.cumsum(rng.uniform(0.5, 1.5, 9)), np.cumsum(rng.uniform(0.5, 1.5, 6)))
    assert node_areas(grid).sum() == pytest.approx(np.ptp(grid.x) * np.ptp(grid.y))
    assert node_areas(Grid([0.0, 2.0], [1.0])).sum() == pytest.approx(2.0)


def test_two_point_correlation_of_a_travelling_wave():
    """A sine of wavelength L correlates with itself as cos(2 pi r / L): its integral length is L / 2 pi."""
    bench = street(count=200, sigma=1e-4, missing=0.1)
    found, lengths, grid = two_point(bench, (0.0, 0.03), "v")
    assert found.node == (10, 0)
    wanted = np.cos(2 * np.pi * grid.x / 0.115)
    assert np.abs(found.coefficient()[5] - wanted).max() < 0.05
    along = lengths["+x"]
    assert along.ends == "zero" and along.length == pytest.approx(0.115 / (2 * np.pi), rel=0.05)
    assert lengths["+y"].ends == "edge" and lengths["-x"].length == 0.0
    with pytest.raises(InputError, match="the run has no component w"):
        two_point(bench, (0.0, 0.03), "w")
