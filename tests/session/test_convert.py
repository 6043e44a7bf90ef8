"""Setting a calibration converts the whole session: measuring after it equals scaling what was measured."""

import numpy as np
import pytest

from fieldview.session.convert import set_calibration
from fieldview.session.measure import measure
from fieldview.session.models import RunSource, Session
from fieldview.session.steps import Calibrate
from tests.session.runs import edited, write_frame

SPACING = 16.0
COLUMNS, ROWS = np.arange(24) * SPACING + 8, np.arange(20) * SPACING + 8
MODEL = {
    "sigma": 0.08,
    "correlation_nodes": 2,
    "window": 32.0,
    "systematic": {"zero_offset": 0.01, "gain": 0.01},
}
REGIONS = [
    {"name": "ring", "shape": "circle", "centre": [190.0, 170.0], "radius": 90.0},
    {
        "name": "oval",
        "shape": "ellipse",
        "centre": [190.0, 170.0],
        "semi_axes": [90.0, 60.0],
        "angle_deg": 30,
    },
    {"name": "box", "shape": "rectangle", "corners": [[60, 70], [300, 240]]},
    {"name": "tri", "shape": "polygon", "points": [[70, 60], [300, 90], [150, 250]]},
    {"name": "cut", "shape": "line", "points": [[60, 60], [300, 200]]},
]
LEDGER = [
    {
        "step": "mask",
        "region": {"shape": "circle", "centre": [30, 30], "radius": 12},
        "motion": [[0, 5, 7, 0]],
    },
    {"step": "range_test", "u": [-9, 9], "speed": [None, 12]},
    {"step": "median_test", "floor": 0.5},
    {"step": "moving_frame", "velocity": [0.5, -0.25], "rotation": 0.001, "about": [100, 120]},
]


@pytest.fixture(scope="module")
def session(tmp_path_factory):
    folder = tmp_path_factory.mktemp("pixels")
    xx, yy = np.meshgrid(COLUMNS, ROWS)
    rng = np.random.default_rng(4)
    u = -0.002 * (yy - 170) + rng.normal(0, 0.08, xx.shape)
    v = 0.002 * (xx - 190) + rng.normal(0, 0.08, xx.shape)
    write_frame(folder / "a.csv", u, v, x=COLUMNS, y=ROWS, units=("px", "px"))
    bare = Session(run=RunSource(files=("a.csv",))).in_folder(folder)
    return edited(bare, regions=REGIONS, ledger=LEDGER, error_model=MODEL)


def numbers(session) -> dict:
    """Value and combined uncertainty of every number of every region."""
    found = {}
    for row in measure(session, 0)[0]["regions"]:
        for key in ("circulation", "flux", "vorticity_integral", "line_integral", "cross_flow"):
            if key in row:
                found[row["name"], key] = (row[key]["value"], row[key]["uncertainty"]["combined"])
    return found


@pytest.mark.parametrize("turned", [False, True])
@pytest.mark.parametrize("downward", [False, True])
def test_calibrating_then_measuring_is_measuring_then_scaling(session, turned, downward):
    # rows downward put the lattice at -y; the contours go there too
    before = session
    if downward:
        run = session.run.model_dump(exclude_none=True) | {
            "reading": {"y_axis": "down", "v_positive": "down"}
        }
        flipped = [{**r, **_mirrored(r)} for r in REGIONS]
        before = edited(session, run=run, regions=flipped, ledger=LEDGER[1:3])
    if turned:
        ledger = [s.model_dump(mode="json", exclude_none=True) for s in before.ledger]
        turn = {"step": "turn_axes", "angle_deg": 25, "about": [50, -60], "shift": [3, 4], "reflect": "y"}
        before = edited(before, ledger=[turn, *ledger])
        # a rectangle's sides stay along the axes, so it cannot go along
        along = tuple(_turned(r, before) for r in before.regions if r.shape != "rectangle")
        before = before.model_copy(update={"regions": along})
    step = Calibrate(metres_per_pixel=1e-4, pulse_separation=0.008, origin=(120, 88))
    after = set_calibration(before, step)
    assert after.units == "m, s"
    factor = 1e-4**2 / 0.008
    told, expected = numbers(after), numbers(before)
    assert len(told) == (11 if turned else 14)
    for key, (value, u) in expected.items():
        assert told[key][0] == pytest.approx(value * factor, rel=1e-9, abs=1e-9 * factor)
        assert told[key][1] == pytest.approx(u * factor, rel=1e-6)


def _mirrored(region: dict) -> dict:
    return {
        key: [value[0], -value[1]] if key == "centre" else [[x, -y] for x, y in value]
        for key, value in region.items()
        if key in ("centre", "corners", "points")
    }


def _turned(region, session):
    """The region moved along when axes are turned, so that it lies on the same vectors."""
    from fieldview.session.convert import _axes

    axes = _axes(session.ledger[0])

    def moved(point):
        z = axes.to_plane(complex(*point))
        return (float(z.real), float(z.imag))

    update = {}
    if hasattr(region, "centre"):
        update["centre"] = moved(region.centre)
    if hasattr(region, "points"):
        update["points"] = tuple(moved(point) for point in region.points)
    return region.model_copy(update=update)


def test_removing_the_calibration_leads_back(session):
    step = Calibrate(metres_per_pixel=(1e-4, 1.25e-4), pulse_separation=0.008, origin=(120, 88))
    even = Calibrate(metres_per_pixel=1e-4, pulse_separation=0.008)
    there_and_back = set_calibration(set_calibration(session, even), None)
    assert numbers(there_and_back)["tri", "circulation"] == pytest.approx(
        numbers(session)["tri", "circulation"], rel=1e-9
    )
    uneven = set_calibration(session, step)
    changed = set_calibration(uneven, even)
    assert numbers(changed)["tri", "flux"] == pytest.approx(
        numbers(set_calibration(session, even))["tri", "flux"], rel=1e-9
    )


def test_different_scales_make_a_circle_an_ellipse(session):
    after = set_calibration(session, Calibrate(metres_per_pixel=(1e-4, 2e-4), pulse_separation=0.01))
    ring = after.regions[0]
    assert ring.shape == "ellipse" and ring.name == "ring"
    assert ring.semi_axes == pytest.approx((0.009, 0.018)) and ring.centre == pytest.approx((0.019, 0.034))
    assert after.error_model.sigma == pytest.approx({"u": 8e-4, "v": 1.6e-3})
    assert after.error_model.window == pytest.approx((0.0032, 0.0064))


def test_every_length_and_velocity_of_the_ledger_moves_along(session):
    after = set_calibration(session, Calibrate(metres_per_pixel=1e-3, pulse_separation=0.1, origin=(10, 20)))
    calibrate, mask, limits, median, frame = after.ledger
    assert calibrate.step == "calibrate"
    assert mask.region.centre == pytest.approx((0.02, 0.01)) and mask.region.radius == pytest.approx(0.012)
    assert mask.motion[0] == pytest.approx((0, 0.005, 0.007, 0))
    assert limits.u == pytest.approx((-0.09, 0.09)) and limits.speed == (None, pytest.approx(0.12))
    assert median.floor == pytest.approx(0.005)
    assert frame.velocity == pytest.approx((0.005, -0.0025)) and frame.rotation == pytest.approx(0.01)
    assert frame.about == pytest.approx((0.09, 0.1))
