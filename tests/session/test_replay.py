"""Replay of the ledger: the same whatever was cached, from the sources every time, with its tallies."""

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.compute.field import Status
from fieldview.session import replay
from fieldview.session.replay import Workbench, evaluate, history, parse_frames
from tests.session.runs import SIGMA, X, Y, edited, vortex_frames, write_frame

LEDGER = [
    {"step": "median_test", "threshold": 2.0, "floor": SIGMA},
    {"step": "time_test", "half_window": 1, "limit": 5},
    {"step": "fill"},
    {"step": "smooth", "width": 0.8},
]


@pytest.fixture(scope="module")
def session(tmp_path_factory):
    return edited(vortex_frames(tmp_path_factory.mktemp("run"), 4), ledger=LEDGER)


def same(one, other) -> bool:
    return all(
        np.array_equal(getattr(one, name), getattr(other, name), equal_nan=True)
        for name in ("u", "v", "status")
    )


def test_the_sources_are_read_as_they_are(session):
    field = evaluate(session, 2, upto=0)
    assert field.grid.shape == (Y.size, X.size)
    assert field.count(Status.MEASURED) == X.size * Y.size
    assert str(field.units) == "m, s"


def test_a_cache_changes_nothing(session):
    cached = Workbench(session, cache_bytes=50_000_000)
    for frame in (0, 3, 1, 1, 2):
        for upto in (4, 2, 0):
            assert same(cached.field(frame, upto=upto), evaluate(session, frame, upto=upto))


def test_every_line_gives_its_tally(session):
    tallies = Workbench(session).tallies(1)
    assert [t.step for t in tallies] == ["median_test", "time_test", "fill", "smooth"]
    rejected = sum(t.counts.get("rejected", 0) for t in tallies)
    assert tallies[2].counts["filled"] == rejected > 0


def test_a_changed_line_runs_only_what_follows_it(session, monkeypatch):
    bench = Workbench(session, cache_bytes=50_000_000)
    for frame in range(4):
        bench.field(frame)
    ran = []
    apply = replay.apply_line
    monkeypatch.setattr(
        replay, "apply_line", lambda f, line, *rest: ran.append(line) or apply(f, line, *rest)
    )
    bench.updated(session).field(1)
    assert ran == []
    changed = edited(session, ledger=[*LEDGER[:3], {"step": "smooth", "width": 1.5}])
    bench.updated(changed).field(1)
    assert ran == [3]
    view_only = session.model_copy(update={"title": "other", "view": {"a": 1}})
    bench.updated(view_only).field(1)
    assert ran == [3]


def test_a_line_switched_off_is_as_if_it_were_not_there(session):
    off = edited(session, ledger=[{**LEDGER[0], "on": False}, *LEDGER[2:]])
    without = edited(session, ledger=LEDGER[2:])
    assert same(evaluate(off, 1), evaluate(without, 1))
    assert Workbench(off).tallies(1)[0].outcome == "switched off"


def test_a_vector_tells_its_history(session):
    spoiled = edited(session, ledger=[{"step": "hand_edit", "reject": [[1, 4, 6]]}, {"step": "fill"}])
    assert history(evaluate(spoiled, 1), 4, 6) == [
        "rejected by line 1 (hand edit)",
        "filled by line 2 (fill)",
    ]


@pytest.mark.parametrize(
    ("sigma", "origin", "level"),
    [(0.02, "given", 0.02), ({"u": 0.03, "v": 0.01}, "given", 0.03), (None, "not stated", None)],
)
def test_stated_sigma_is_used(session, sigma, origin, level):
    model = {} if sigma is None else {"sigma": sigma}
    error = evaluate(edited(session, error_model=model, ledger=[]), 0).error
    assert error.origin == origin
    assert level is None or float(error.sigma["u"]) == level


def test_estimated_sigma_finds_the_noise(session):
    error = evaluate(edited(session, error_model={"sigma": "estimate"}, ledger=[]), 0).error
    assert error.origin == "estimated"
    assert error.sigma["u"] == pytest.approx(SIGMA, rel=0.15)


def test_sigma_from_the_file(session, tmp_path):
    xx, yy = np.meshgrid(X, Y)
    spread = 0.001 + 0.1 * xx
    write_frame(tmp_path / "a.csv", yy, xx, **{"sigma_u [m/s]": spread, "sigma_v [m/s]": 2 * spread})
    with_file = edited(session, run={"files": ["a.csv"]}, ledger=[]).in_folder(tmp_path)
    for named in ({}, {"sigma": "from file"}):
        error = evaluate(edited(with_file, error_model=named), 0).error
        assert error.origin == "from file"
        assert np.allclose(error.sigma["v"], 2 * spread)
    with pytest.raises(InputError, match="no column of uncertainties"):
        evaluate(edited(session, error_model={"sigma": "from file"}), 0)


def test_a_correlation_left_out_is_said_and_a_window_follows_from_it(session):
    bare = evaluate(session, 0).error
    assert (bare.correlation, bare.correlation_stated) == ((1.0, 1.0), False)
    stated = evaluate(edited(session, error_model={"correlation_nodes": [2, 1.5]}), 0).error
    assert stated.correlation_stated
    assert stated.window == pytest.approx((0.004, 0.003))


def test_units_that_do_not_fit_the_run_are_an_error(session):
    with pytest.raises(
        InputError, match=r'units says "px, pulse", but the run .* is in "m, s"; correct units'
    ):
        evaluate(edited(session, units="px, pulse"), 0)


def test_changed_sources_are_said(session, tmp_path):
    own = vortex_frames(tmp_path, 2)
    saved = Workbench(own).with_digests()
    assert sorted(saved.run.digests) == ["f0.csv", "f1.csv"]
    assert Workbench(saved).changed_sources() == []
    (tmp_path / "f1.csv").write_text((tmp_path / "f1.csv").read_text() + "# looked at\n")
    assert Workbench(saved).changed_sources() == ["f1.csv has changed since the session was saved"]
    (tmp_path / "f0.csv").unlink()
    assert any("f0.csv was part of the run" in said for said in Workbench(saved).changed_sources())


@pytest.mark.parametrize(
    ("spec", "frames"),
    [(None, list(range(10))), ("3", [3]), ("0:100:5", [0, 5]), ("7:", [7, 8, 9]), ("1,4,2", [1, 4, 2]),
     ("-3:", [7, 8, 9]), ("mean", ["mean"]), ("fluctuation:3", ["fluctuation:3"]),
     ("fluctuation:0:2", ["fluctuation:0", "fluctuation:1"]), ("phase:2", ["phase:2:0", "phase:2:1"]),
     ("phase:8:5", ["phase:8:5"])],
)  # fmt: skip
def test_frames_are_chosen_by_a_text(spec, frames):
    assert parse_frames(spec, 10) == frames


@pytest.mark.parametrize(
    "spec",
    [
        "",
        "a",
        "1:2:3:4",
        "1::0",
        "10",
        "20:30",
        "1,,2",
        "1.5",
        "phase:0",
        "phase:4:4",
        "phase:",
        "fluctuation:",
        "fluctuation:12",
    ],
)
def test_other_texts_are_refused(spec):
    with pytest.raises(InputError, match="frame"):
        parse_frames(spec, 10)


def test_frames_that_do_not_exist_are_refused(session):
    with pytest.raises(InputError, match="frame 4 does not exist; the run has frames 0 to 3"):
        evaluate(session, 4)
