"""The command as a user meets it: exit status, stdout for results, stderr for talk, nothing half-written."""

import json
import os

import pytest

from fieldview import cli
from fieldview.session.measure import measure
from fieldview.session.store import load_session, save_session
from tests.session.runs import SIGMA, edited, vortex_frames, write_frame
from tests.session.test_measure import BOW, MODEL, REGIONS


@pytest.fixture
def run(capsys):
    """A function that runs the command: (exit status, stdout, stderr)."""

    def call(*arguments):
        status = cli.run([str(argument) for argument in arguments])
        told = capsys.readouterr()
        assert "Traceback" not in told.err
        return status, told.out, told.err

    return call


@pytest.fixture(scope="module")
def session_path(tmp_path_factory):
    folder = tmp_path_factory.mktemp("run")
    run = vortex_frames(folder, 3)
    ledger = [{"step": "median_test", "floor": SIGMA}, {"step": "fill"}]
    save_session(edited(run, regions=REGIONS, error_model=MODEL, ledger=ledger), folder / "v.session.json")
    return folder / "v.session.json"


def spoiled(session_path, folder, **parts):
    """The session with some keys replaced, in a folder of its own."""
    document = json.loads(session_path.read_text()) | parts
    document["run"] = {"files": [str(session_path.parent / "f*.csv")]} | parts.get("run", {})
    path = folder / "spoiled.session.json"
    path.write_text(json.dumps(document))
    return path


def test_measure_prints_what_python_gives(run, session_path):
    status, out, err = run("measure", session_path, "--format", "json")
    assert (status, err) == (0, "")
    told = json.loads(out, parse_constant=lambda word: pytest.fail(f"{word} is no JSON"))
    assert told["session"] == "v.session.json"
    assert told["frames"] == json.loads(json.dumps(measure(load_session(session_path))))


def test_measure_as_csv_has_units_and_uncertainties_in_columns_of_their_own(run, session_path, tmp_path):
    import pandas

    status, out, _ = run("measure", session_path, "--format", "csv", "--out", tmp_path / "table.csv")
    assert (status, out) == (0, "")
    table = pandas.read_csv(tmp_path / "table.csv")
    rows = measure(load_session(session_path))
    assert len(table) == 9 and list(table["region"][:3]) == ["core", "box", "cut"]
    assert set(table["circulation_unit"].dropna()) == {"m^2/s"}
    value = rows[1]["regions"][0]["circulation"]
    assert table["circulation"][3] == value["value"]
    assert table["circulation_u_combined"][3] == value["uncertainty"]["combined"]
    assert os.listdir(tmp_path) == ["table.csv"]


def test_measure_as_a_table_fits_a_terminal(run, session_path):
    status, out, _ = run("measure", session_path, "--frames", "1")
    assert status == 0
    assert out.startswith("frame 1\n") and "core (circle)" in out and " ± " in out and "m²/s" in out
    assert max(map(len, out.splitlines())) <= 100


def test_frames_are_chosen(run, session_path):
    for spec, frames in (("1", [1]), ("0:3:2", [0, 2]), ("mean", ["mean"])):
        out = run("measure", session_path, "--format", "json", "--frames", spec)[1]
        assert [row["frame"] for row in json.loads(out)["frames"]] == frames


def test_a_region_without_an_answer_is_null_with_its_reason_and_exit_1(run, session_path, tmp_path):
    bow = {"name": "bow", "shape": "polygon", "points": BOW}
    far = {"name": "far", "shape": "circle", "centre": [1, 1], "radius": 0.01}
    path = spoiled(session_path, tmp_path, regions=[*REGIONS, bow, far])
    status, out, err = run("measure", path, "--format", "json", "--frames", "0")
    assert status == 1
    rows = {row["name"]: row for row in json.loads(out)["frames"][0]["regions"]}
    assert rows["bow"]["circulation"]["value"] is None and rows["core"]["circulation"]["value"] is not None
    assert 'frame 0: "bow" has no value: the contour crosses itself' in err
    assert '"far" has no value' in err


def test_a_contour_through_a_gap_has_null_line_numbers(run, session_path, tmp_path):
    mask = {"step": "mask", "region": {"shape": "circle", "centre": [0.03, 0.016], "radius": 0.003}}
    path = spoiled(session_path, tmp_path, ledger=[mask], regions=REGIONS[:1])
    status, out, _ = run("measure", path, "--format", "json", "--frames", "0")
    core = json.loads(out)["frames"][0]["regions"][0]
    assert status == 1 and core["circulation"]["value"] is None and core["index"] is None
    assert 0.5 < core["coverage"]["contour"] < 1 and "gap" in core["warnings"][0]


def test_a_bad_frame_is_skipped_and_said(run, session_path, tmp_path):
    run_here = vortex_frames(tmp_path, 3)
    (tmp_path / "f1.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,nonsense,1\n")
    save_session(edited(run_here, regions=REGIONS, error_model=MODEL), tmp_path / "a.session.json")
    status, out, err = run("measure", tmp_path / "a.session.json", "--format", "json")
    assert status == 1 and [row["frame"] for row in json.loads(out)["frames"]] == [0, 2]
    assert "frame 1 was skipped: f1.csv" in err


def test_a_changed_source_is_said_not_refused(run, session_path, tmp_path):
    from fieldview.session.replay import Workbench

    own = edited(vortex_frames(tmp_path, 2), regions=REGIONS, error_model=MODEL)
    save_session(Workbench(own).with_digests(), tmp_path / "a.session.json")
    assert run("measure", tmp_path / "a.session.json")[0] == 0
    (tmp_path / "f0.csv").write_text((tmp_path / "f0.csv").read_text() + "# seen\n")
    status, out, err = run("measure", tmp_path / "a.session.json")
    assert status == 1 and "frame 1" in out
    assert err == "loopflux: f0.csv has changed since the session was saved\n"


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["measure"], "missing argument"),
        (["measure", "nope.session.json"], "nope.session.json: cannot be read (No such file or directory)"),
        (["measure", "{session}", "--frames", "9"], "frame 9: the run has 3 frames, 0 to 2"),
        (["measure", "{session}", "--format", "xml"], "--format xml is not known; use table, csv, json"),
        (["measure", "{session}", "--nope"], "no such option: --nope"),
        (["measure", "{session}", "--out", "no/such/folder/a.csv"], "its folder does not exist"),
        (["measur", "{session}"], "measur: is neither a command nor a file that exists"),
        (["--colour"], "no such option: --colour"),
        (["peek", "nope.csv"], "nope.csv: does not exist"),
        (["apply", "{session}"], "missing option '--out'"),
        (["apply", "{session}", "--out", "{folder}/out", "--to", "xls"], "--to xls is not known"),
        (["apply", "{session}", "--out", "{folder}/out", "--quantities", "heat"], 'no quantity "heat"'),
        (["apply", "{session}", "--out", "{session}"], "is a file; choose a folder"),
        (["sample", "nothing", "{folder}"], "there is no sample nothing; there are fin_wake"),
        (["sample", "fin_wake"], "name the folder too"),
        (["sample", "a", "b", "c"], "sample takes a name and a folder"),
    ],
)  # fmt: skip
def test_a_bad_request_is_one_sentence_and_exit_2(
    run, session_path, tmp_path, monkeypatch, arguments, message
):
    monkeypatch.chdir(tmp_path)
    places = {"session": session_path, "folder": tmp_path}
    status, out, err = run(*(argument.format(**places) for argument in arguments))
    assert (status, out) == (2, "")
    assert err.startswith("loopflux: ") and err.count("\n") == 1 and message in err
    assert os.listdir(tmp_path) == []


@pytest.mark.parametrize(
    ("parts", "message"),
    [
        ({"colour": 1}, "colour is not a known key"),
        ({"ledger": [{"step": "polish"}]}, '"polish" is not known'),
        ({"version": 2}, "use a newer Loopflux"),
        ({"units": "px, pulse"}, 'units says "px, pulse"'),
        ({"error_model": {"sigma": "from file"}}, "no column of uncertainties"),
        ({"ledger": [{"step": "quality_test", "channel": "snr", "at_least": 1}]}, 'no channel "snr"'),
        ({"run": {"files": ["nope*.csv"]}}, 'nothing fits "nope*.csv"'),
        ({"regions": []}, "has no regions to measure"),
    ],
)
def test_a_bad_session_is_one_sentence_and_exit_2(run, session_path, tmp_path, parts, message):
    path = spoiled(session_path, tmp_path, **parts)
    for command in (
        ["measure", path, "--out", tmp_path / "out.txt"],
        ["apply", path, "--out", tmp_path / "out"],
    ):
        if command[0] == "apply" and parts == {"regions": []}:
            continue  # a session without regions can still be applied
        status, out, err = run(*command)
        assert (status, out) == (2, "")
        assert err.count("\n") == 1 and message in err
        assert os.listdir(tmp_path) == ["spoiled.session.json"]


def test_peek_says_what_must_be_answered(run, tmp_path):
    from tests.session.runs import X, Y

    write_frame(tmp_path / "a.csv", *(2 * [[[0.5] * X.size] * Y.size]), units=("furlong", "knot"))
    status, out, _ = run("peek", tmp_path / "a.csv")
    assert status == 0 and "21 x 17 nodes" in out and "furlong" in out
    (tmp_path / "b.csv").write_text((tmp_path / "a.csv").read_text().replace("[furlong]", ""))
    status, out, _ = run("peek", tmp_path / "b.csv")
    assert status == 1 and "say under length_unit in what the positions" in out


def test_without_a_display_the_window_is_refused_and_measure_named(run, session_path, monkeypatch):
    for name in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM"):
        monkeypatch.delenv(name, raising=False)
    for arguments in ([], [session_path]):
        status, out, err = run(*arguments)
        assert (status, out) == (2, "") and err.count("\n") == 1
        assert "there is no display" in err and "loopflux measure" in err


def test_schema_and_version(run):
    status, out, _ = run("schema")
    assert status == 0 and json.loads(out)["properties"]["ledger"]
    assert run("--version") == (0, "loopflux 0.1.0\n", "")
    assert run("--help")[0] == 0
