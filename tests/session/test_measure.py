"""Rows of `measure`: the contract's form, the same numbers by every road, and reasons for every null."""

import json
import math
import re

import numpy as np
import pytest

import fieldview as lf
from fieldview.compute.errors import InputError
from fieldview.session.measure import measure, unanswered
from fieldview.session.replay import Workbench
from fieldview.session.store import load_session, save_session
from tests.session.runs import CENTRE, CORE, GAMMA, SIGMA, edited, vortex_frames, write_frame

REGIONS = [
    {"name": "core", "shape": "circle", "centre": CENTRE, "radius": 0.01},
    {"name": "box", "shape": "rectangle", "corners": [[0.01, 0.006], [0.03, 0.026]]},
    {"name": "cut", "shape": "line", "points": [[0.02, 0.002], [0.02, 0.03]]},
]
BOW = [[0.01, 0.01], [0.03, 0.03], [0.03, 0.01], [0.01, 0.03]]
MODEL = {
    "sigma": SIGMA,
    "correlation_nodes": 1,
    "systematic": {
        "scale": 0.003,
        "pulse_separation": 0.001,
        "gain": 0.0,
        "axis_tilt": 0.002,
        "zero_offset": 0.0,
    },
    "window": 0,
}


@pytest.fixture(scope="module")
def session(tmp_path_factory):
    run = vortex_frames(tmp_path_factory.mktemp("run"), 3)
    return edited(run, regions=REGIONS, error_model=MODEL)


def regions_of(session, frame=0) -> dict:
    return {row["name"]: row for row in measure(session, frame)[0]["regions"]}


def test_rows_have_the_contracts_form_and_are_strict_json(session):
    rows = measure(session)
    json.dumps(rows, allow_nan=False)
    assert [(row["frame"], row["time"]) for row in rows] == [(0, None), (1, None), (2, None)]
    core, _, cut = rows[0]["regions"]
    assert core["closed"] and core["length"]["unit"] == "m" and core["area"]["unit"] == "m^2"
    assert core["coverage"] == {"contour": 1.0, "area": 1.0, "filled": 0.0, "cubic": 1.0}
    for key in ("circulation", "flux", "vorticity_integral", "divergence_integral"):
        assert set(core[key]) == {"value", "unit", "uncertainty"} and core[key]["unit"] == "m^2/s"
        assert set(core[key]["uncertainty"]) == {"random", "systematic", "gaps", "combined"}
    assert set(core["closure"]) == set(core["resolution_gap"]) == {"circulation", "flux"}
    assert set(core["window_gap"]) == {"circulation"}
    assert core["index"] == 1
    assert not cut["closed"] and {"line_integral", "cross_flow"} <= set(cut)
    assert not {"circulation", "area", "closure", "index"} & set(cut)
    assert "area" not in cut["coverage"]


def test_the_circulation_is_the_vortex_s_within_its_uncertainty(session):
    core = regions_of(session)["core"]["circulation"]
    truth = GAMMA * -math.expm1(-((0.01 / CORE) ** 2))
    assert abs(core["value"] - truth) < 3 * core["uncertainty"]["combined"]
    assert core["uncertainty"]["combined"] < 0.03 * truth


def test_combined_is_the_root_of_the_squares(session):
    for row in regions_of(session).values():
        for key in ("circulation", "flux", "line_integral", "cross_flow"):
            if key in row:
                parts = row[key]["uncertainty"]
                known = [v for name, v in parts.items() if name != "combined" and v is not None]
                assert parts["combined"] == pytest.approx(math.hypot(*known), rel=1e-12)
                assert math.hypot(*(p["uncertainty"] for p in row["budget"][key])) == pytest.approx(
                    parts["combined"], rel=1e-9
                )


def test_a_session_written_and_read_measures_the_same_to_the_last_bit(session, tmp_path):
    save_session(session, tmp_path / "again.session.json")
    again = measure(load_session(tmp_path / "again.session.json"))
    assert json.dumps(again) == json.dumps(measure(session))


def test_the_public_names_lead_to_the_same_numbers(session, tmp_path):
    save_session(session, tmp_path / "a.session.json")
    opened = lf.load_session(tmp_path / "a.session.json")
    assert lf.measure(opened, frames=range(2)) == measure(session, "0:2")
    omega = lf.quantity(lf.evaluate(opened, frame=0), "vorticity")
    assert omega.shape == (17, 21) and omega.max() > 0


def test_without_sigma_random_and_combined_are_null_and_said(session):
    core = regions_of(edited(session, error_model={}))["core"]
    assert core["circulation"]["uncertainty"]["random"] is None
    assert core["circulation"]["uncertainty"]["combined"] is None
    assert any("sigma" in warning for warning in core["warnings"])


def test_a_correlation_left_out_makes_a_lower_bound(session):
    bare = regions_of(edited(session, error_model={"sigma": SIGMA}))["core"]
    assert any("lower bound" in warning for warning in bare["warnings"])
    assert not any("lower bound" in warning for warning in regions_of(session)["core"]["warnings"])


@pytest.mark.parametrize(
    ("region", "reason"),
    [
        ({"shape": "circle", "centre": [0.04, 0.016], "radius": 0.01}, "outside|beyond|leaves"),
        ({"shape": "circle", "centre": [1.0, 1.0], "radius": 0.01}, "outside|beyond|leaves"),
        ({"shape": "polygon", "points": BOW}, "crosses itself"),
    ],
)
def test_a_region_without_an_answer_is_null_with_its_reason(session, region, reason):
    odd = edited(session, regions=[*REGIONS, {"name": "odd", **region}])
    row = measure(odd, 0)[0]
    assert unanswered(row) == ["odd"]
    found = row["regions"][-1]
    assert found["circulation"]["value"] is None and found["index"] is None
    assert any(re.search(reason, warning) for warning in found["warnings"]), found["warnings"]
    assert row["regions"][:-1] == measure(session, 0)[0]["regions"]


def test_the_mean_of_identical_frames_has_the_value_and_a_smaller_random_part(session, tmp_path):
    xx, yy = np.meshgrid(range(6), range(5))
    for name in "abcd":
        write_frame(tmp_path / f"{name}.csv", -0.1 * yy, 0.1 * xx, x=range(6), y=range(5))
    square = [{"name": "s", "shape": "rectangle", "corners": [[1, 1], [4, 3]]}]
    four = edited(session, run={"files": ["*.csv"]}, regions=square).in_folder(tmp_path)
    one = regions_of(four)["s"]["circulation"]
    mean = measure(four, "mean")[0]
    assert mean["frame"] == "mean"
    of_mean = mean["regions"][0]["circulation"]
    assert of_mean["value"] == pytest.approx(one["value"], rel=1e-13) == pytest.approx(0.2 * 6)
    assert of_mean["uncertainty"]["random"] == pytest.approx(one["uncertainty"]["random"] / 2)
    assert of_mean["uncertainty"]["systematic"] == pytest.approx(one["uncertainty"]["systematic"])


def test_a_bad_frame_is_skipped_where_asked_and_an_error_else(session, tmp_path):
    run = vortex_frames(tmp_path, 3)
    (tmp_path / "f1.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,nonsense,1\n")
    spoiled = edited(run, regions=REGIONS, error_model=MODEL)
    skipped = []
    rows = measure(spoiled, on_skip=lambda frame, error: skipped.append((frame, str(error))))
    assert [row["frame"] for row in rows] == [0, 2]
    assert skipped[0][0] == 1 and "f1.csv" in skipped[0][1]
    with pytest.raises(InputError, match=r"f1\.csv"):
        measure(spoiled)


def test_the_window_s_numbers_are_these(session):
    from fieldview.session.measure import measure_field, region_row

    bench = Workbench(session, cache_bytes=10_000_000)
    field = bench.field(1)
    numbers = measure_field(session, field)
    rows = [region_row(region, numbers[region.name]) for region in session.regions]
    assert rows == measure(session, 1)[0]["regions"]
