"""The choices study: on a flow that leaves no choice nothing scatters, on others the right choice does."""

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.publish.studies import choices_study
from fieldview.session.choices import FILLINGS, cleanings
from fieldview.session.models import RunSource, Session
from fieldview.session.replay import Workbench
from tests.session.runs import CIRCLE, SIGMA, X, Y, edited, vortex, vortex_frames, write_frame

LEDGER = [{"step": "median_test", "threshold": 2.0, "floor": SIGMA}, {"step": "fill"}]
MODEL = {"sigma": SIGMA, "correlation_nodes": 1, "window": 0}


def test_a_uniform_shear_scatters_only_with_the_size_of_the_contour(tmp_path):
    """Of v = g x every contour, scheme and interpolant gives g times the area; only the area changes."""
    xx, _ = np.meshgrid(X, Y)
    write_frame(tmp_path / "f0.csv", 0 * xx, 3.0 * xx)
    session = edited(
        Session(run=RunSource(files=("f0.csv",))).in_folder(tmp_path),
        regions=[CIRCLE],
        ledger=LEDGER,
        error_model=MODEL,
    )
    study = choices_study(Workbench(session), "core", 0)
    assert len(study.rows) == 3 * 4 * 4 * 2 * 7 and study.remarks() == []
    (row,) = [row for row in study.summary() if row["number"] == "circulation"]
    for factor in ("threshold", "filling", "derivative", "line"):
        assert row["alone"][factor]["range"] < 1e-12 * abs(row["mean"])
    radius, half = 0.008, 0.001
    grown = 3.0 * np.pi * (radius + half) ** 2
    shrunk = 3.0 * np.pi * (radius - half) ** 2
    assert row["highest"] == pytest.approx(grown, rel=1e-9)
    assert row["lowest"] == pytest.approx(shrunk, rel=1e-9)
    assert row["alone"]["contour"]["range"] == pytest.approx(grown - shrunk, rel=1e-9)
    moved = [values["circulation"] for chosen, values in study.rows if "along" in chosen["contour"]]
    assert np.allclose(moved, 3.0 * np.pi * radius**2, rtol=1e-9)


def test_a_vortex_with_outliers_scatters_with_all_choices(tmp_path):
    rng = np.random.default_rng(3)
    xx, yy = np.meshgrid(X, Y)
    u, v = (part + rng.normal(0, SIGMA, part.shape) for part in vortex(xx, yy))
    u[rng.random(u.shape) < 0.06] += 0.5
    u[8, 14] = v[8, 14] = np.nan
    write_frame(tmp_path / "f0.csv", u, v)
    session = edited(
        Session(run=RunSource(files=("f0.csv",))).in_folder(tmp_path),
        regions=[CIRCLE],
        ledger=LEDGER,
        error_model=MODEL,
    )
    study = choices_study(Workbench(session), "core", 0)
    (row,) = [row for row in study.summary() if row["number"] == "vorticity_integral"]
    assert all(row["alone"][factor]["deviation"] > 0 for factor in ("filling", "derivative", "contour"))
    assert row["alone"]["line"]["range"] == 0, "an area integral knows no line"
    assert row["lowest"] <= row["measured"]["value"] <= row["highest"]
    assert row["deviation_over_uncertainty"] == pytest.approx(
        row["deviation"] / row["measured"]["uncertainty"]["combined"]
    )
    own = {factor: names[0] for factor, names in study.choices.items()}
    assert own == {
        "threshold": "2",
        "filling": "linear",
        "derivative": "central",
        "line": "bilinear",
        "contour": "as drawn",
    }
    ours = [values for chosen, values in study.rows if chosen == own]
    assert [values["vorticity_integral"] for values in ours] == [row["measured"]["value"]]


def test_what_the_ledger_has_not_is_not_varied_and_said(tmp_path):
    session = edited(vortex_frames(tmp_path), regions=[CIRCLE, {"name": "cut", "shape": "line",
        "points": [[0.01, 0.004], [0.01, 0.03]]}])  # fmt: skip
    study = choices_study(Workbench(session), "cut", 0)
    assert set(study.choices) == {"derivative", "line", "contour"} and len(study.choices["derivative"]) == 1
    assert len(study.rows) == 2 * 5
    assert any("threshold of the median test is not varied" in said for said in study.remarks())
    (row, _) = study.summary()
    assert row["deviation_over_uncertainty"] is None, "without a sigma there is nothing to set it against"
    with pytest.raises(InputError, match='no region "tub"'):
        choices_study(Workbench(session), "tub", 0)


def test_combinations_without_a_value_are_counted(tmp_path):
    edge = {**CIRCLE, "centre": [0.0085, 0.016]}
    session = edited(vortex_frames(tmp_path), regions=[edge])
    study = choices_study(Workbench(session), "core", 0)
    assert any("16 of 56 combinations have a number without a value" in said for said in study.remarks())
    assert study.summary()[0]["combinations"] == 40


def test_every_cleaning_is_tried_the_own_one_first(tmp_path):
    ledger = [*LEDGER, {"step": "fill", "on": False, "method": "harmonic"}]
    session = edited(vortex_frames(tmp_path), ledger=ledger)
    found = cleanings(session)
    assert len(found) == 3 * len(FILLINGS)
    assert found[0].chosen == {"threshold": "2", "filling": "linear"}
    assert found[0].session.ledger[:2] == session.ledger[:2]
    assert {way.session.ledger[0].threshold for way in found} == {1.5, 2.0, 3.0}
