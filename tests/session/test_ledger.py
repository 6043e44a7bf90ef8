"""What each ledger line does to one frame, and what it says of it."""

from dataclasses import dataclass, field

import numpy as np
import pytest

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid
from fieldview.compute.units import PIXEL
from fieldview.session import steps
from fieldview.session.ledger import apply_line
from fieldview.session.regions import CircleShape, RectangleShape
from fieldview.session.replay import history

X, Y = np.arange(12) * 0.5, np.arange(9) * 0.5
XX, YY = np.meshgrid(X, Y)


@dataclass
class Alone:
    """A run of one frame, or of the stack given."""

    frame: int = 0
    rows_downward: bool = False
    others: list = field(default_factory=list)
    mean: complex = 0j

    def stack(self, half_window):
        return self.others

    def run_mean(self):
        return self.mean

    def noise(self):
        return {"u": 0.1, "v": 0.2, "w": 0.3}


def shear(**more) -> Field:
    """u = 1 + 0.1 y, v = 0.1 x: a linear flow, gentle enough in u for a median test to leave alone."""
    return Field(Grid(X, Y), **({"u": 1 + 0.1 * YY, "v": 0.1 * XX} | more))


def with_outlier(iy=4, ix=5, value=30.0) -> Field:
    u = 1 + 0.1 * YY
    u[iy, ix] = value
    return shear(u=u)


def test_median_test_rejects_the_outlier_and_says_floor_and_reason():
    after, tally = apply_line(with_outlier(), 3, steps.MedianTest(), Alone())
    assert list(zip(*np.nonzero(after.status == Status.REJECTED), strict=True)) == [(4, 5)]
    assert tally.counts == {"rejected": 1}
    assert tally.sentence == "Median test, radius 1, threshold 2"
    assert tally.outcome == "1 rejected (0.9 %), floor 0.1, 0.2 m/s (noise estimated from the run)"
    assert history(after, 4, 5)[0].startswith("rejected by line 4 (median test, residual ")
    assert history(after, 4, 6) == []


def test_median_test_names_sigma_where_it_was_stated():
    noisy = with_outlier().with_(error=ErrorModel(sigma={"u": 0.1, "v": 0.1}, origin="given"))
    _, tally = apply_line(noisy, 0, steps.MedianTest(), Alone())
    assert tally.outcome.endswith("(sigma)")
    _, tally = apply_line(noisy, 0, steps.MedianTest(floor=0.05), Alone())
    assert tally.outcome == "1 rejected (0.9 %)"


def test_fill_restores_a_linear_flow_and_keeps_the_measured_value_reachable():
    rejected, _ = apply_line(with_outlier(), 0, steps.MedianTest(), Alone())
    for method in ("linear", "harmonic", "biharmonic", "local_median"):
        filled, tally = apply_line(rejected, 1, steps.Fill(method=method), Alone())
        assert filled.status[4, 5] == Status.FILLED
        assert filled.u[4, 5] == pytest.approx(1 + 0.1 * YY[4, 5], abs=1e-10), method
        assert filled.measured["u"][4, 5] == 30.0
        assert tally.counts == {"filled": 1}
    assert [line.split(" (")[0] for line in history(filled, 4, 5)] == [
        "rejected by line 1",
        "filled by line 2",
    ]


def test_fill_leaves_wide_gaps_and_masked_nodes():
    u = 1 + 0.1 * YY
    u[3:6, 4:7] = np.nan
    u[1, 1] = np.nan
    masked, _ = apply_line(shear(u=u), 0, mask_at(4.5, 3.5, 0.3), Alone())
    after, tally = apply_line(masked, 1, steps.Fill(max_gap=2), Alone())
    assert tally.counts == {"filled": 1, "left missing": 9}
    assert after.status[1, 1] == Status.FILLED
    assert after.status[7, 9] == Status.MASKED


def mask_at(x, y, radius, **more) -> steps.Mask:
    return steps.Mask(region=CircleShape(centre=(x, y), radius=radius), **more)


def test_a_mask_takes_either_side():
    box = RectangleShape(corners=((0.9, 0.9), (2.1, 2.1)))
    inside = apply_line(shear(), 0, steps.Mask(region=box), Alone())[0].status == Status.MASKED
    outside = (
        apply_line(shear(), 0, steps.Mask(region=box, keep="inside"), Alone())[0].status == Status.MASKED
    )
    assert inside.sum() == 9 and (inside != outside).all()


def test_a_moving_mask_follows_its_keyframes_and_is_held_beyond_them():
    step = mask_at(1.0, 1.0, 0.3, motion=((2, 0, 0, 0), (6, 2.0, 1.0, 0)))
    expected = {0: (1.0, 1.0), 2: (1.0, 1.0), 4: (2.0, 1.5), 6: (3.0, 2.0), 9: (3.0, 2.0)}
    for frame, (x, y) in expected.items():
        status = apply_line(shear(), 0, step, Alone(frame=frame))[0].status
        (iy,), (ix,) = np.nonzero(status == Status.MASKED)
        assert (X[ix], Y[iy]) == (x, y)


def test_a_moving_mask_turns_about_its_own_centroid():
    bar = RectangleShape(corners=((1.9, 0.4), (2.1, 2.6)))
    step = steps.Mask(region=bar, motion=((0, 0, 0, 0), (1, 0, 0, 90)))
    upright, lying = (apply_line(shear(), 0, step, Alone(frame=f))[0].status == Status.MASKED for f in (0, 1))
    assert np.ptp(np.nonzero(upright)[1]) == 0 and np.ptp(np.nonzero(upright)[0]) == 4
    assert np.ptp(np.nonzero(lying)[0]) == 0 and np.ptp(np.nonzero(lying)[1]) == 4


def test_a_mask_and_a_quality_test_from_a_channel():
    peaked = shear(channels={"peak ratio": XX})
    masked, _ = apply_line(peaked, 0, steps.Mask(channel="peak ratio", at_most=0.6), Alone())
    assert ((masked.status == Status.MASKED) == (XX <= 0.6)).all()
    tested, tally = apply_line(peaked, 0, steps.QualityTest(channel="peak ratio", at_least=1.3), Alone())
    assert ((tested.status == Status.REJECTED) == (XX < 1.3)).all()
    assert tally.sentence == "Quality test, peak ratio at least 1.3"
    with pytest.raises(InputError, match='no channel "snr"; its channels are: peak ratio'):
        apply_line(peaked, 0, steps.Mask(channel="snr", at_least=1), Alone())


def test_range_test_judges_the_turned_components():
    turned, _ = apply_line(shear(), 0, steps.TurnAxes(angle_deg=90), Alone())
    # turned axes: the new u is the old v
    after, _ = apply_line(turned, 1, steps.RangeTest(u=(None, 0.3)), Alone())
    assert ((after.status == Status.REJECTED) == (0.1 * XX > 0.3)).all()
    with pytest.raises(InputError, match="no component w; remove its limits"):
        apply_line(shear(), 1, steps.RangeTest(w=(0, 1)), Alone())


def test_spread_and_time_tests():
    after, _ = apply_line(with_outlier(), 0, steps.SpreadTest(limit=6), Alone())
    assert (after.status[4, 5], after.count(Status.REJECTED)) == (Status.REJECTED, 1)
    rng = np.random.default_rng(0)
    frames = [shear(u=1 + 0.1 * YY + 0.01 * rng.normal(size=YY.shape)) for _ in range(7)]
    spoiled = np.array(frames[3].u)
    spoiled[2, 2] = 9.0
    frames[3] = frames[3].with_(u=spoiled, measured={})
    after, tally = apply_line(frames[3], 0, steps.TimeTest(limit=8), Alone(frame=3, others=frames))
    assert after.status[2, 2] == Status.REJECTED
    _, tally = apply_line(frames[0], 0, steps.TimeTest(), Alone(others=frames[:4]))
    assert "only 4 frames in reach" in tally.outcome


def test_hand_edits_belong_to_their_frame_and_are_checked():
    step = steps.HandEdit(reject=((0, 1, 2), (1, 3, 3)))
    after, tally = apply_line(shear(), 0, step, Alone())
    assert tally.counts == {"rejected": 1} and after.status[1, 2] == Status.REJECTED
    back, tally = apply_line(after, 1, steps.HandEdit(keep=((0, 1, 2),)), Alone())
    assert tally.counts == {"taken back": 1}
    assert (back.status[1, 2], back.u[1, 2]) == (Status.MEASURED, shear().u[1, 2])
    with pytest.raises(
        InputError, match=r"vector \[0, 9, 0\] is outside the lattice of 9 rows and 12 columns"
    ):
        apply_line(shear(), 0, steps.HandEdit(reject=((0, 9, 0),)), Alone())


def test_moving_frames():
    moved, tally = apply_line(shear(), 0, steps.MovingFrame(velocity=(1.0, 0.5)), Alone())
    assert np.allclose(moved.u, 0.1 * YY) and np.allclose(moved.v, 0.1 * XX - 0.5)
    assert tally.outcome == "(1, 0.5) m/s taken away"
    mean, _ = apply_line(shear(), 0, steps.MovingFrame(mean="frame"), Alone())
    assert abs(mean.u.mean()) < 1e-13 and abs(mean.v.mean()) < 1e-13
    run, _ = apply_line(shear(), 0, steps.MovingFrame(mean="run"), Alone(mean=2 + 1j))
    assert np.allclose(run.u, 0.1 * YY - 1)
    turning, _ = apply_line(shear(), 0, steps.MovingFrame(rotation=0.5, about=(1.0, 0.5)), Alone())
    assert np.allclose(turning.u, 1 + 0.1 * YY + 0.5 * (YY - 0.5))
    assert np.allclose(turning.v, 0.1 * XX - 0.5 * (XX - 1.0))


def test_calibration_counts_rows_as_the_file_does():
    rows = Field(Grid(np.arange(5) * 16.0, -np.arange(4)[::-1] * 16.0), u=np.ones((4, 5)), v=np.ones((4, 5)),
                 units=PIXEL)  # fmt: skip
    step = steps.Calibrate(metres_per_pixel=1e-4, pulse_separation=0.01, origin=(16, 32))
    after, _ = apply_line(rows, 0, step, Alone(rows_downward=True))
    assert after.grid.x[1] == 0 and after.grid.y[1] == pytest.approx(0, abs=1e-18)
    assert after.u[0, 0] == pytest.approx(0.01)


def test_smoothing_keeps_the_statuses():
    after, tally = apply_line(with_outlier(), 0, steps.Smooth(width=0.7), Alone())
    assert (after.status == Status.MEASURED).all() and after.u[4, 5] < 30
    assert tally.outcome == "108 smoothed"


def test_a_self_crossing_mask_is_refused_with_its_place():
    bow = {"shape": "polygon", "points": [[0, 0], [1, 1], [1, 0], [0, 1]]}
    with pytest.raises(InputError, match=r"ledger\[2\]\.region: the contour crosses itself"):
        apply_line(shear(), 2, steps.Mask(region=bow), Alone())
