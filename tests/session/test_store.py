"""Session files: written whole, read back the same, and every mistake said in one sentence."""

import json
import os

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fieldview.compute.errors import InputError
from fieldview.session import store
from fieldview.session.models import Session
from fieldview.session.store import dump_session, load_session, parse_session, save_session, schema

FULL = {
    "format": "loopflux-session",
    "version": 1,
    "title": "Wake — Ω",
    "units": "m, s",
    "run": {
        "files": ["run/*.csv"],
        "reading": {"columns": {"x": "X", "v": 3}, "length_unit": "mm", "y_axis": "down", "missing": [9999]},
        "digests": {"run/f0.csv": "sha256:00"},
    },
    "error_model": {
        "sigma": {"u": 0.005, "v": 0.004},
        "correlation_nodes": [2, 1.5],
        "systematic": {"scale": 0.003, "pulse_separation": 0.001, "axis_tilt": 0.002, "zero_offset": 0.0},
        "window": [0.006, 0.006],
    },
    "derivative": "richardson",
    "line": "cubic",
    "ledger": [
        {"step": "calibrate", "metres_per_pixel": [1e-4, 2e-4], "pulse_separation": 0.004},
        {"step": "turn_axes", "angle_deg": 12.5, "reflect": "x"},
        {"step": "mask", "region": {"shape": "circle", "centre": [0, 0], "radius": 0.1}},
        {"step": "range_test", "u": [None, 2.0]},
        {"step": "median_test", "on": False, "radius": 2},
        {"step": "hand_edit", "reject": [[0, 1, 2]]},
        {"step": "fill", "method": "harmonic", "max_gap": 3},
        {"step": "smooth"},
    ],
    "regions": [
        {"name": "core", "shape": "circle", "centre": [0.03, 0.02], "radius": 0.01},
        {
            "name": "oval",
            "shape": "ellipse",
            "centre": [0.03, 0.02],
            "semi_axes": [0.01, 0.006],
            "angle_deg": 20,
        },
        {"name": "cv", "shape": "rectangle", "corners": [[0, 0], [0.1, 0.05]]},
        {
            "name": "hand",
            "shape": "polygon",
            "points": [[0, 0], [0.02, 0], [0.01, 0.02]],
            "colour": "#0072b2",
        },
        {"name": "cut", "shape": "line", "points": [[0, 0], [0, 0.05]]},
    ],
    "reference": {"length": 0.05, "velocity": 0.2},
    "view": {"quantity": "vorticity"},
}


def test_only_format_version_and_files_are_required():
    session = parse_session('{"format": "loopflux-session", "version": 1, "run": {"files": ["a.csv"]}}')
    assert session.run.files == ("a.csv",)
    assert (session.derivative, session.line, session.ledger) == ("central", "bilinear", ())


def test_a_full_session_is_written_and_read_back_the_same(tmp_path):
    session = parse_session(json.dumps(FULL)).in_folder(tmp_path)
    save_session(session, tmp_path / "a.session.json")
    again = load_session(tmp_path / "a.session.json")
    assert again == session
    assert again.folder == tmp_path
    save_session(again, tmp_path / "b.session.json")
    assert (tmp_path / "a.session.json").read_bytes() == (tmp_path / "b.session.json").read_bytes()


@given(st.lists(st.floats(allow_nan=False, allow_infinity=False), min_size=6, max_size=6))
def test_every_number_survives_to_the_last_bit(numbers):
    points = list(zip(numbers[::2], numbers[1::2], strict=True))
    document = {**FULL, "regions": [{"name": "r", "shape": "polygon", "points": points}]}
    session = Session.model_validate(document)
    assert parse_session(dump_session(session)).regions[0].points == tuple(points)


def test_paths_follow_the_session_to_another_folder(tmp_path):
    (tmp_path / "run").mkdir()
    (tmp_path / "elsewhere").mkdir()
    session = parse_session(json.dumps(FULL)).in_folder(tmp_path)
    save_session(session, tmp_path / "elsewhere" / "moved.session.json")
    moved = load_session(tmp_path / "elsewhere" / "moved.session.json")
    assert moved.run.files == ("../run/*.csv",)
    assert list(moved.run.digests) == ["../run/f0.csv"]


def test_a_failed_write_leaves_the_old_file_and_nothing_else(tmp_path, monkeypatch):
    path = tmp_path / "a.session.json"
    session = parse_session(json.dumps(FULL)).in_folder(tmp_path)
    save_session(session, path)
    before = path.read_bytes()

    def full_disk(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "replace", full_disk)
    with pytest.raises(InputError, match=r"a\.session\.json: cannot be written \(No space left"):
        save_session(session.model_copy(update={"title": "new"}), path)
    assert path.read_bytes() == before
    assert os.listdir(tmp_path) == ["a.session.json"]


def changed(**parts) -> str:
    return json.dumps({**FULL, **parts})


def region(**parts) -> str:
    return changed(regions=[{"name": "a", "shape": "circle", "centre": [0, 0], "radius": 1, **parts}])


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "line 1: is not valid JSON"),
        ('{"format": "loopflux-session",\n"version": 1,,}', "line 2: is not valid JSON"),
        ("[1, 2]", 'it must say "format": "loopflux-session"'),
        ('{"version": 1}', 'it must say "format": "loopflux-session"'),
        (changed(version=2), "is of version 2, this program knows up to 1; use a newer Loopflux"),
        (changed(version="1"), "version is '1'; it must be a whole number"),
        (changed(version=-3), "version -3 was never in use"),
        (changed(colour="red"), "colour is not a known key; correct or remove it"),
        (changed(run={}), r"run\.files is required but left out"),
        (changed(run={"files": []}), r"run\.files"),
        (changed(run={"files": ["a"], "reading": {"unit": "mm"}}), r"run\.reading\.unit is not a known key"),
        (changed(units="ft, s"), r'units is "ft, s": input should be \'m, s\' or \'px, pulse\''),
        (changed(ledger=[{"step": "polish"}]), r'ledger\[0\]: "polish" is not known; use one of calibrate'),
        (changed(ledger=[{"radius": 1}]), r"ledger\[0\]\.step is required but left out"),
        (changed(ledger=[{"step": "median_test", "limit": 2}]), r"ledger\[0\]\.limit is not a known key"),
        (changed(ledger=[{"step": "median_test", "radius": 0}]), r"ledger\[0\]\.radius is 0: .*greater than"),
        (changed(ledger=[{"step": "fill"}, {"step": "turn_axes"}]), "turn_axes must come before the other"),
        (changed(ledger=[{"step": "turn_axes"}] * 2), "turn_axes may stand in the ledger only once"),
        (changed(ledger=[{"step": "mask"}]), r"ledger\[0\]: a mask takes either a region or a channel"),
        (region(radius=-1), r"regions\[0\]\.radius is -1: .*greater than 0"),
        (region(radius="wide"), r'regions\[0\]\.radius is "wide": .*number'),
        (region(shape="blob"), r'regions\[0\]: "blob" is not known; use one of circle'),
        (region(centre=[0]), r"regions\[0\]\.centre"),
        (region().replace('"radius": 1', '"radius": NaN'), "has the number NaN, which JSON does not know"),
        (region().replace('"radius": 1', '"radius": 1, "radius": 2'), 'has the key "radius" twice'),
        (changed(regions=FULL["regions"][:1] * 2), 'two regions are named "core"; names must be unique'),
        (changed(error_model={"sigma": "guess"}), r'error_model\.sigma.*"from file" or "estimate"'),
        (changed(error_model={"sigma": -1}), r"error_model.*sigma must not be negative"),
        (changed(error_model={"correlation_nodes": 0}), "correlation_nodes must be positive"),
    ],
)
def test_every_mistake_is_one_sentence_with_its_place(text, message, tmp_path):
    path = tmp_path / "bad.session.json"
    path.write_text(text)
    with pytest.raises(InputError, match=message) as caught:
        load_session(path)
    said = str(caught.value)
    assert said.startswith(str(path))
    assert "\n" not in said and "pydantic" not in said and "Value error" not in said


def test_unreadable_files_are_named(tmp_path):
    with pytest.raises(InputError, match=r"missing\.json: cannot be read \(No such file"):
        load_session(tmp_path / "missing.json")
    (tmp_path / "binary.json").write_bytes(b"\xff\xfe\x00\x81")
    with pytest.raises(InputError, match="is not UTF-8 text"):
        load_session(tmp_path / "binary.json")


def test_an_older_version_is_migrated(monkeypatch):
    def from_zero(document):
        renamed = {key: value for key, value in document.items() if key != "name"}
        return {**renamed, "version": 1, "title": document["name"]}

    monkeypatch.setitem(store.MIGRATIONS, 0, from_zero)
    old = '{"format": "loopflux-session", "version": 0, "name": "old", "run": {"files": ["a.csv"]}}'
    assert parse_session(old).title == "old"


def test_the_schema_describes_every_key():
    described = schema()
    assert set(FULL) <= set(described["properties"])
    steps = [d["properties"] for d in described["$defs"].values() if "step" in d.get("properties", {})]
    assert len(steps) == 12
    for keys in steps:
        for name, entry in keys.items():
            assert name == "step" or entry.get("description"), name
