"""`choices`, `compare` and `repeats` on the command line."""

import json

import numpy as np
import pytest

from fieldview.session.store import save_session
from tests.session.runs import CIRCLE, SIGMA, edited, vortex_frames

MODEL = {"sigma": SIGMA, "correlation_nodes": 1, "window": 0}
LEDGER = [{"step": "median_test", "floor": SIGMA}, {"step": "fill"}]


@pytest.fixture(scope="module")
def paths(tmp_path_factory):
    """Three runs of the same vortex."""
    found = []
    for seed in range(3):
        folder = tmp_path_factory.mktemp(f"run{seed}")
        session = edited(
            vortex_frames(folder, 4, seed=seed), regions=[CIRCLE], error_model=MODEL, ledger=LEDGER
        )
        found.append(folder / "v.session.json")
        save_session(session, found[-1])
    return found


def test_choices(run, paths):
    status, out, err = run("choices", paths[0])
    assert (status, err) == (0, "") and "combinations of defensible choices" in out
    assert "the analyst: ±" in out and "place and size of the contour alone" in out
    status, one, _ = run("choices", paths[0], "--region", "core", "--format", "json")
    numbers = json.loads(one)["studies"][0]["numbers"]
    assert status == 0 and {row["number"] for row in numbers} >= {"circulation", "flux"}
    status, two, _ = run("choices", paths[0], "--region", "core", "--format", "json", "--workers", "2")
    assert status == 0 and two == one
    status, out, _ = run("choices", paths[0], "--frame", "mean", "--format", "csv")
    assert status == 0 and out.startswith("region,number,")


def test_compare(run, paths, tmp_path):
    status, out, err = run("compare", paths[0], paths[1], "--maps", tmp_path / "d.npz")
    assert (status, err) == (0, "") and "within its uncertainty" in out and "of the nodes differ" in out
    with np.load(tmp_path / "d.npz") as written:
        assert written["u_uncertainty"].max() == pytest.approx(2**0.5 * SIGMA)
    status, out, _ = run("compare", paths[0], paths[0], "--frame", "0", "--other", "mean", "--format", "json")
    found = json.loads(out)
    assert status == 0 and found["second"]["frame"] == "mean"
    assert found["regions"][0]["difference"]["value"] == pytest.approx(
        found["regions"][0]["second"]["value"] - found["regions"][0]["first"]["value"]
    )
    status, out, _ = run("compare", paths[0], paths[2], "--shared-calibration", "--format", "csv")
    assert status == 0 and len(out.splitlines()) > 2


def test_repeats(run, paths):
    status, out, err = run("repeats", *paths)
    assert (status, err) == (0, "") and "3 repeats" in out and "Birge ratio" in out
    status, out, _ = run("repeats", *paths, "--frames", "0", "--format", "json")
    rows = json.loads(out)["numbers"]
    assert status == 0 and {row["repeats"] for row in rows} == {3}
    status, out, _ = run("repeats", paths[0], "--format", "csv")
    assert status == 0 and ",4," in out.splitlines()[1]


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        (("choices", 0, "--region", "tub"), "there is no region"),
        (("choices", 0, "--frame", "0:2"), "name one frame"),
        (("compare", 0, 1, "--frame", "9"), "the run has 4 frames"),
        (("compare", 0, 1, "--beyond", "0"), "coverage factor"),
        (("compare", 0, 1, "--maps", "x.png"), "the ending must be"),
        (("repeats", 0, 1), "at least 3"),
        (("repeats", 0, 0, 1), "named twice"),
        (("repeats", 0, 1, 2, "--format", "xml"), "is not known"),
    ],
)
def test_bad_requests_are_one_sentence(run, paths, arguments, sentence):
    filled = [paths[entry] if isinstance(entry, int) else entry for entry in arguments]
    status, out, err = run(*filled)
    assert (status, out) == (2, "") and sentence in err and err.count("\n") == 1
