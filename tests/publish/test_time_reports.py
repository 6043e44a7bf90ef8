"""`series`, `cycle`, `modes` and `correlate` on a vortex whose strength is known at every instant."""

import json

import numpy as np
import pytest
import xarray

from fieldview.session.store import load_session, save_session
from tests.session.runs import CENTRE, FREQUENCY, GAMMA, PHASES, edited, pulsing_frames

CYCLES = 5


@pytest.fixture(scope="module")
def session_path(tmp_path_factory):
    folder = tmp_path_factory.mktemp("run")
    reference = {"length": 0.01, "length_name": "core", "u_length": 1e-4, "velocity": 0.1}
    reference["u_velocity"] = 0.002
    session = edited(pulsing_frames(folder, CYCLES), reference=reference, phase={"frequency": FREQUENCY})
    save_session(session, folder / "pulse.session.json")
    return folder / "pulse.session.json"


def test_a_region_over_time_gives_back_the_pulse(run, session_path):
    status, out, err = run("series", session_path, "--region", "core", "--format", "json")
    found = json.loads(out)
    assert (status, err, found["missing"]) == (0, "", 0)
    samples = found["samples"]
    assert len(samples) == CYCLES * PHASES and samples[1]["unit"] == "m^2/s"
    main = found["dominant_frequency"]
    assert abs(main["value"] - FREQUENCY) < 3 * main["uncertainty"] < 0.1
    assert main["unit"] == "Hz" and main["share"] > 0.95
    # a circle of 1.6 core radii holds 1 - exp(-2.56) of the circulation, that goes up and down by half
    held = GAMMA * -np.expm1(-(1.6**2))
    assert found["mean"]["value"] == pytest.approx(held, rel=0.02)
    assert main["amplitude"] == pytest.approx(held / 2, rel=0.05)
    strouhal = found["strouhal"]
    assert strouhal["value"] == pytest.approx(FREQUENCY * 0.01 / 0.1, rel=0.02)
    assert strouhal["length_name"] == "core" and strouhal["not_stated"] == []
    relative = np.hypot.reduce([main["uncertainty"] / main["value"], 0.01, 0.02])
    assert strouhal["uncertainty"]["combined"] == pytest.approx(strouhal["value"] * relative, rel=0.01)
    spectrum = found["spectrum"]
    assert spectrum["frequency"][int(np.argmax(spectrum["density"]))] == pytest.approx(FREQUENCY, abs=0.3)
    assert found["correlation"]["rho"][0] == 1.0


def test_the_series_itself_comes_as_csv_and_its_meaning_as_a_table(run, session_path):
    place = f"{CENTRE[0] + 0.005},{CENTRE[1]}"
    status, out, _ = run("series", session_path, "--at", place, "--quantity", "v", "--format", "csv")
    lines = out.splitlines()
    assert status == 0 and len(lines) == 1 + CYCLES * PHASES
    assert lines[0] == "frame,time,value,random,unit,mean_so_far,mean_uncertainty"
    status, out, _ = run("series", session_path, "--at", place, "--quantity", "v")
    assert status == 0 and "dominant frequency" in out and "Hz" in out and "on the core" in out


def test_a_bad_frame_of_a_series_is_skipped_and_said(run, tmp_path):
    session = pulsing_frames(tmp_path, 2)
    save_session(session, tmp_path / "p.session.json")
    (tmp_path / "f3.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,nonsense,1\n")
    for command in (("series", "--region", "core"), ("modes", "--count", "2")):
        status, out, err = run(command[0], tmp_path / "p.session.json", *command[1:])
        assert status == 1 and "frame 3 was skipped" in err and "frame 3 was skipped" in " ".join(out.split())


def test_the_bins_of_the_cycle(run, session_path):
    status, out, _ = run("cycle", session_path, "--bins", "4", "--format", "json")
    bins = json.loads(out)["bins"]
    assert status == 0 and [row["frames"] for row in bins] == [2 * CYCLES] * 4
    # frames at the bin's centre and at its edge, an eighth of a cycle apart
    assert all(row["first_harmonic_kept"] == pytest.approx(np.cos(np.pi / 8), abs=1e-9) for row in bins)
    status, out, _ = run("cycle", session_path, "--bins", "8")
    assert status == 0 and "45.0°" in out


def test_one_mode_holds_the_pulse_and_is_written_as_maps(run, session_path, tmp_path):
    maps = tmp_path / "modes.nc"
    status, out, _ = run("modes", session_path, "--count", "3", "--format", "json", "--maps", maps)
    found = json.loads(out)
    assert status == 0 and found["modes"][0]["share"] > 0.9 and found["modes"][0]["apart"]
    first = np.array(found["coefficients"])[:, 0]
    pulse = np.cos(2 * np.pi * np.arange(first.size) / PHASES)
    assert abs(np.corrcoef(first, pulse)[0, 1]) > 0.99
    with xarray.open_dataset(maps, engine="h5netcdf") as written:
        assert {"mode_1_u", "mode_3_v"} <= set(written)
    status, out, _ = run("modes", session_path, "--count", "2")
    assert status == 0 and "mode  1" in out and "as independent" in out


def test_correlations_fall_off_from_their_node(run, session_path, tmp_path):
    maps = tmp_path / "rho.npz"
    asked = ("correlate", session_path, "--at", f"{CENTRE[0] + 0.006},{CENTRE[1]}")
    status, out, _ = run(*asked, "--first", "v", "--maps", maps, "--format", "json")
    found = json.loads(out)
    assert status == 0 and found["samples"] == CYCLES * PHASES
    assert all(row["length"] > 0 and row["unit"] == "m" for row in found["lengths"])
    with np.load(maps) as written:
        assert np.nanmax(written["correlation"]) == pytest.approx(1.0)
    status, out, _ = run(*asked)
    assert status == 0 and "integral length +x" in out


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        (("series",), "needs either a probe"),
        (("series", "--at", "1,2", "--region", "core"), "needs either a probe"),
        (("series", "--region", "shell"), "there is no region"),
        (("series", "--region", "core", "--number", "luck"), "has no number"),
        (("series", "--at", "9,9"), "outside the grid"),
        (("series", "--at", "9"), "write a point as x,y"),
        (("series", "--at", "0.02,0.016", "--quantity", "luck"), "is not known"),
        (("series", "--region", "core", "--band", "1"), "two frequencies"),
        (("series", "--region", "core", "--frames", "mean"), "by number"),
        (("cycle", "--bins", "0"), "one or more"),
        (("modes", "--maps", "modes.txt"), "the ending must be"),
        (("modes", "--format", "xml"), "is not known"),
        (("correlate", "--at", "0.02,0.016", "--first", "w"), "no component w"),
    ],
)
def test_bad_requests_are_one_sentence(run, session_path, arguments, sentence):
    command, *rest = arguments
    status, out, err = run(command, session_path, *rest)
    assert (status, out) == (2, "") and sentence in err and err.count("\n") == 1


def test_a_cycle_needs_to_know_its_phase(run, session_path, tmp_path):
    session = load_session(session_path).model_copy(update={"phase": None})
    save_session(session, tmp_path / "no.session.json")
    status, _, err = run("cycle", tmp_path / "no.session.json")
    assert status == 2 and 'add "phase"' in err
