"""`apply`: whole files or none, the same bytes again, and going on where it was stopped."""

import json
import os
import signal
import subprocess
import sys
import time

import numpy as np
import pytest

from fieldview import cli
from fieldview.files import open_run
from fieldview.session.measure import measure
from fieldview.session.replay import evaluate
from fieldview.session.store import load_session, save_session
from tests.session.runs import SIGMA, edited, vortex_frames
from tests.session.test_measure import MODEL, REGIONS

FRAMES = 8


@pytest.fixture(scope="module")
def session_path(tmp_path_factory):
    folder = tmp_path_factory.mktemp("run")
    ledger = [{"step": "median_test", "floor": SIGMA}, {"step": "fill"}]
    regions = [{**REGIONS[0], "name": "=core"}, *REGIONS[1:]]
    session = edited(vortex_frames(folder, FRAMES), regions=regions, error_model=MODEL, ledger=ledger)
    save_session(session, folder / "vortex.session.json")
    return folder / "vortex.session.json"


def content(folder) -> dict[str, bytes]:
    return {name: (folder / name).read_bytes() for name in sorted(os.listdir(folder))}


@pytest.fixture(scope="module")
def undisturbed(session_path, tmp_path_factory):
    out = tmp_path_factory.mktemp("out") / "a"
    assert cli.run(["apply", str(session_path), "--out", str(out), "--quantities", "vorticity"]) == 0
    return out


def test_everything_is_there_and_nothing_else(undisturbed, session_path):
    names = [f"vortex_{number:05d}.csv" for number in range(FRAMES)]
    assert sorted(os.listdir(undisturbed)) == ["record.json", "regions.csv", *names]
    session = load_session(session_path)
    field = evaluate(session, 5)
    back = open_run([undisturbed / "vortex_00005.csv"])[0]
    for name in ("u", "v", "status"):
        assert np.array_equal(getattr(back, name), getattr(field, name), equal_nan=True)
    assert "vorticity" in back.channels and "vorticity_uncertainty" in back.channels


def test_the_table_holds_what_measure_gives_and_no_formulas(undisturbed, session_path):
    import pandas

    table = pandas.read_csv(undisturbed / "regions.csv")
    expected = measure(load_session(session_path))[3]["regions"][0]["circulation"]["value"]
    assert table[table["frame"] == 3]["circulation"].iloc[0] == expected
    assert table["region"][0] == "'=core"


def test_the_record_says_what_was_done_and_where_from_but_not_when(undisturbed, session_path):
    record = json.loads((undisturbed / "record.json").read_text())
    assert [entry["frame"] for entry in record["frames"]] == list(range(FRAMES))
    assert record["ledger"][0]["counts"]["rejected"] >= record["ledger"][1]["counts"]["filled"] > 0
    assert record["sources"] == load_session_digests(session_path)
    assert record["sigma"] == "given" and record["quantities"] == ["vorticity"]
    text = json.dumps(record)
    assert str(session_path.parent) not in text and os.uname().nodename not in text.split('"')


def load_session_digests(session_path):
    from fieldview.session.replay import Workbench

    return Workbench(load_session(session_path)).run.digests()


@pytest.mark.parametrize("to", ["nc", "npz"])
def test_other_formats_hold_the_same_field(to, session_path, tmp_path, undisturbed):
    assert (
        cli.run(["apply", str(session_path), "--out", str(tmp_path / to), "--to", to, "--frames", "2"]) == 0
    )
    back = open_run([tmp_path / to / f"vortex_00002.{to}"])[0]
    same = open_run([undisturbed / "vortex_00002.csv"])[0]
    assert np.array_equal(back.u, same.u, equal_nan=True) and np.array_equal(back.status, same.status)


def test_done_again_it_finds_everything_there(undisturbed, session_path, capsys):
    before = content(undisturbed)
    assert cli.run(["apply", str(session_path), "--out", str(undisturbed), "--quantities", "vorticity"]) == 0
    assert "everything is there already" in capsys.readouterr().err
    assert content(undisturbed) == before


def test_another_session_or_other_options_are_refused(undisturbed, session_path, capsys):
    before = content(undisturbed)
    assert cli.run(["apply", str(session_path), "--out", str(undisturbed), "--quantities", "speed"]) == 2
    assert "holds the results of another session" in capsys.readouterr().err
    assert content(undisturbed) == before


def test_files_of_others_are_never_overwritten(session_path, tmp_path, capsys):
    (tmp_path / "regions.csv").write_text("mine")
    assert cli.run(["apply", str(session_path), "--out", str(tmp_path)]) == 2
    assert "holds regions.csv already" in capsys.readouterr().err
    assert content(tmp_path) == {"regions.csv": b"mine"}


def test_killed_it_goes_on_and_ends_with_the_same_bytes(undisturbed, session_path, tmp_path):
    out = tmp_path / "a"
    command = [sys.executable, "-m", "fieldview", "apply", str(session_path), "--out", str(out)]
    command += ["--quantities", "vorticity"]
    process = subprocess.Popen(command, stderr=subprocess.DEVNULL)
    deadline = time.monotonic() + 60
    while (
        time.monotonic() < deadline and process.poll() is None and not list(out.glob("vortex_0000[2-9].csv"))
    ):
        time.sleep(0.005)
    process.send_signal(signal.SIGKILL)
    process.wait()
    whole = content(undisturbed)
    for path in out.glob("vortex_*.csv"):
        assert path.read_bytes() == whole[path.name], "only whole files stand under their own name"
    assert not (out / "record.json").exists() or process.returncode == 0
    subprocess.run(command, check=True)
    assert content(out) == whole


def test_a_bad_frame_is_left_out_and_recorded(tmp_path, capsys):
    run = vortex_frames(tmp_path, 3)
    (tmp_path / "f1.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,nonsense,1\n")
    save_session(edited(run, regions=REGIONS, error_model=MODEL), tmp_path / "a.session.json")
    out = tmp_path / "out"
    assert cli.run(["apply", str(tmp_path / "a.session.json"), "--out", str(out)]) == 1
    assert "frame 1 was skipped: f1.csv" in capsys.readouterr().err
    assert sorted(os.listdir(out)) == ["a_00000.csv", "a_00002.csv", "record.json", "regions.csv"]
    record = json.loads((out / "record.json").read_text())
    assert "f1.csv" in record["frames"][1]["remarks"][0]


def test_strict_ends_at_a_bad_frame(tmp_path, capsys):
    run = vortex_frames(tmp_path, 4)
    good = (tmp_path / "f2.csv").read_text()
    (tmp_path / "f2.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,nonsense,1\n")
    session = tmp_path / "a.session.json"
    save_session(edited(run, regions=REGIONS, error_model=MODEL), session)
    out = tmp_path / "out"
    assert cli.run(["measure", str(session), "--strict"]) == 2
    told = capsys.readouterr()
    assert told.out == "" and "frame 2: f2.csv" in told.err
    assert cli.run(["apply", str(session), "--out", str(out), "--strict"]) == 2
    assert "frame 2 was skipped: f2.csv" in capsys.readouterr().err
    assert (out / "a_00001.csv").is_file() and not (out / "record.json").exists()
    (tmp_path / "f2.csv").write_text(good)
    # other sources than before: the results so far are not theirs
    assert cli.run(["apply", str(session), "--out", str(out), "--strict"]) == 2
    assert "holds the results of another session, other sources" in capsys.readouterr().err
    assert cli.run(["apply", str(session), "--out", str(tmp_path / "anew"), "--strict"]) == 0
