"""The run's mean: filled vectors stay out, and the noise divides as independent frames do."""

import numpy as np
import pytest

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid
from fieldview.session.mean import mean_of

GRID = Grid(np.arange(6.0), np.arange(5.0))


def frames(count=4, seed=1):
    rng = np.random.default_rng(seed)
    error = ErrorModel(sigma={"u": 0.2, "v": 0.4}, origin="given")
    return [Field(GRID, u=u, v=v, error=error) for u, v in rng.normal(size=(count, 2, *GRID.shape))]


def test_mean_of_whole_frames_is_numpys_mean():
    run = frames()
    mean = mean_of(run)
    assert np.allclose(mean.u, np.mean([f.u for f in run], axis=0), rtol=0, atol=1e-15)
    assert mean.error.sigma["u"] == pytest.approx(np.full(GRID.shape, 0.1))
    assert mean.error.sigma["v"] == pytest.approx(np.full(GRID.shape, 0.2))
    assert mean.time is None


def test_filled_and_rejected_vectors_are_left_out_and_said():
    run = frames()
    status = np.array(run[0].status)
    status[2, 3], status[1, 1] = Status.FILLED, Status.REJECTED
    run[0] = run[0].with_(status=status)
    mean = mean_of(run)
    rest = np.mean([f.u for f in run[1:]], axis=0)
    assert mean.u[2, 3] == pytest.approx(rest[2, 3]) and mean.u[1, 1] == pytest.approx(rest[1, 1])
    assert mean.error.sigma["u"][2, 3] == pytest.approx(0.2 / np.sqrt(3))
    assert any("the fewest frames behind a node are 3" in note for note in mean.notes)


def test_a_node_masked_in_every_frame_is_masked_and_one_never_measured_is_missing():
    run = frames(2)
    run = [f.with_(status=np.where(np.indices(GRID.shape)[1] == 0, Status.MASKED, f.status)) for f in run]
    first = np.array(run[0].status)
    first[2, 2] = Status.MASKED
    second = np.array(run[1].status)
    second[2, 2] = Status.MISSING
    mean = mean_of([run[0].with_(status=first), run[1].with_(status=second)])
    assert (mean.status[:, 0] == Status.MASKED).all() and mean.status[2, 2] == Status.MISSING
    assert np.isnan(mean.u[2, 2])


def test_no_frames_have_no_mean():
    with pytest.raises(InputError, match="no frames to take a mean of"):
        mean_of([])
