"""Bad files: one sentence that names file, line and remedy, never a traceback."""

import gzip
import os

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.files import NeedsAnswer, open_run, peek
from fieldview.files.reading import Reading
from tests.files.dialects import METRES, U, V, X, Y, rows, text

GOOD = text(rows())
LINES = GOOD.splitlines()


def spoiled(line: int, content: str) -> str:
    return "\n".join([*LINES[: line - 1], content, *LINES[line:]]) + "\n"


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", r"a\.csv: is empty"),
        (b"\n\n   \n", r"a\.csv: is empty"),
        (b"x [m],y [m],u [m/s],v [m/s]\n", r"a\.csv: has no line of numbers"),
        (bytes(range(256)) * 20, r"a\.csv: is a binary file of no known kind"),
        (b"\x89PNG\r\n\x1a\n" + bytes(200), r"a\.csv: is a binary file of no known kind"),
        (b"u [m/s]\n1\n2\n3\n", r"a\.csv: has one column only"),
        ("\n".join(LINES[:20])[:-12], r"a\.csv, line 20: has [123] of 4 columns, the file seems cut off"),
        (spoiled(7, "0.5,1.0,fast,0.1"), r'a\.csv, line 7: "fast" in the column "u" is no number; correct'),
        (spoiled(9, "0.5,1.0,0.1,0.2,0.3"), r"a\.csv, line 9: has 5 columns where the other lines have 4"),
        (GOOD.replace("[m/s]", "[kg]"), r'a\.csv: "u" is in kg, which is neither a velocity nor'),
        (GOOD.replace("[m/s]", "[blorp]"), r'a\.csv: the unit of "u": "blorp" is no unit that is known'),
        (GOOD.replace("x [m]", "x [s]"), r'a\.csv: "x" is in s, which is no length'),
        (GOOD.replace("x [m]", "x [px]"), r"a\.csv: x and y are not both in pixels"),
        (GOOD.replace("[m/s]", "[px]"), r'a\.csv: "u" is in px, but the positions are in a length'),
        (text(rows(u=np.full_like(U, np.nan), v=np.full_like(V, np.nan)), missing="nan"),
         r"a\.csv: every vector is missing"),
        (text(np.random.default_rng(0).normal(size=(200, 4))),
         r"a\.csv: the 200 positions do not lie on rows"),
        (GOOD.replace("x [m],y [m]", "longitude [degrees_east],latitude [degrees_north]"),
         r'a\.csv: "longitude" is a longitude or latitude; project'),
        (gzip.compress(GOOD.encode())[:200], r"a\.csv: is cut off or not whole gzip data"),
        (b"CDF\x01" + b"\xfe" * 50, r"a\.csv: is cut off or damaged NetCDF"),
        (b"\x89HDF\r\n\x1a\n" + bytes(50), r"a\.csv: is cut off or damaged HDF5"),
        (b"PK\x03\x04" + bytes(50), r"a\.csv: is cut off or damaged"),
    ],
)  # fmt: skip
def test_a_bad_file_is_named_with_what_is_wrong_and_what_to_do(content, message, tmp_path):
    raw = content.encode() if isinstance(content, str) else content
    (tmp_path / "a.csv").write_bytes(raw)
    for read in (lambda: open_run(["a.csv"], folder=tmp_path)[0], lambda: peek(tmp_path / "a.csv")):
        with pytest.raises(InputError, match=message) as caught:
            read()
        assert "\n" not in str(caught.value)


def test_pickled_objects_are_never_loaded(tmp_path):
    np.savez(tmp_path / "a.npz", x=np.array([{"a": 1}], dtype=object))
    with pytest.raises(InputError, match="holds pickled objects, which are not loaded"):
        peek(tmp_path / "a.npz")


def test_files_that_are_not_there_or_cannot_be_read(tmp_path):
    with pytest.raises(InputError, match=r"nope\.csv: does not exist; check the path"):
        open_run(["nope.csv"], folder=tmp_path)
    with pytest.raises(InputError, match=r'nothing fits "\*\.csv"'):
        open_run(["*.csv"], folder=tmp_path)
    with pytest.raises(InputError, match="holds no data files; known endings are"):
        open_run([tmp_path])
    with pytest.raises(InputError, match="no files are named"):
        open_run([])
    (tmp_path / "a.csv").write_text(GOOD)
    run = open_run(["a.csv"], folder=tmp_path)
    os.remove(tmp_path / "a.csv")
    os.mkdir(tmp_path / "a.csv")
    with pytest.raises(InputError, match=r"is a folder|holds no data files"):
        open_run(["a.csv"], folder=tmp_path)
    assert len(run) == 1


@pytest.mark.skipif(os.geteuid() == 0, reason="root may read everything")
def test_a_file_without_permission(tmp_path):
    (tmp_path / "a.csv").write_text(GOOD)
    (tmp_path / "a.csv").chmod(0)
    with pytest.raises(InputError, match=r"a\.csv: cannot be read \(Permission denied\)"):
        open_run(["a.csv"], folder=tmp_path)


def test_frames_of_different_grids_or_units_are_refused_when_they_are_read(tmp_path):
    (tmp_path / "f1.csv").write_text(GOOD)
    (tmp_path / "f2.csv").write_text(text(rows(x=np.meshgrid(X + 0.1, Y)[0])))
    (tmp_path / "f3.csv").write_text(GOOD.replace("[m]", "[px]").replace("[m/s]", "[px]"))
    run = open_run(["*.csv"], folder=tmp_path)
    assert len(run) == 3
    with pytest.raises(InputError, match=r"f2\.csv: its x positions are not those of the run's first frame"):
        run[1]
    with pytest.raises(InputError, match=r'f3\.csv: is in "px, pulse" where the first file is in "m, s"'):
        run[2]


@pytest.mark.parametrize(
    ("content", "keys", "words"),
    [
        (text(rows(), header="x,y,u,v"), ["length_unit", "velocity_unit"], '"x" and "y" are'),
        (text(rows(), header="x [m],y [m],u,v"), ["velocity_unit"], '"u" and "v" are'),
        (text(rows(), header="a [m],b [m],c,d"), ["columns"], "which is x and y and u, v or w"),
        (text(rows(), header=""), ["columns"], '"column 0", "column 1"'),
        (text(rows(), header="x [m],y [m],Ux [m/s],Vx [m/s]"), ["columns"], 'which is u: "Ux" or "Vx"'),
        (text(rows(), header="x [mm],y [mm],u [mm],v [mm]"), ["pulse_separation"], "not the frame interval"),
        (text(rows(), header="x [m],y [m],speed [m/s],direction [deg]"),
         ["direction_zero", "direction_sense"], "comes from"),
    ],
)  # fmt: skip
def test_what_a_file_does_not_say_is_asked_and_never_guessed(content, keys, words, tmp_path):
    path = tmp_path / "a.csv"
    path.write_text(content)
    with pytest.raises(NeedsAnswer, match=r"a\.csv: say under") as caught:
        open_run([path])
    assert [question.key for question in caught.value.questions] == keys
    assert words in str(caught.value)
    asked = peek(path)
    assert [question.key for question in asked.questions] == keys
    assert all(question.sentence in asked.text() for question in asked.questions)


@pytest.mark.parametrize(
    ("reading", "message"),
    [
        ({"columns": {"x": "nope"}}, r'columns\.x is "nope", but the file has "x", "y", "u", "v"'),
        ({"columns": {"x": 9}}, r"columns\.x is column 9, but the file has columns 0 to 3"),
        ({"columns": {"q": "x"}}, r'"q" is no role; use one of x, y, u'),
        ({"ignore": ("nope",)}, r'ignore is "nope"'),
        ({"length_unit": "parsec per second"}, "which is no length"),
        ({"length_unit": "zork"}, '"zork" is no unit'),
    ],
)
def test_answers_that_do_not_fit_are_refused(reading, message, tmp_path):
    (tmp_path / "a.csv").write_text(GOOD)
    with pytest.raises(InputError, match=message):
        open_run(["a.csv"], Reading(**reading), folder=tmp_path)


def test_a_single_row_or_column_of_nodes_opens(tmp_path):
    (tmp_path / "row.csv").write_text(text(rows()[:9]))
    (tmp_path / "column.csv").write_text(text(rows()[::9]))
    assert open_run(["row.csv"], folder=tmp_path).grid.shape == (1, 9)
    assert open_run(["column.csv"], folder=tmp_path).grid.shape == (7, 1)


def test_arrays_that_do_not_fit_the_axes(tmp_path):
    np.savez(tmp_path / "a.npz", x=X, y=Y, u=U[:-1], v=V[:-1])
    with pytest.raises(InputError, match='"u" has the shape 6 x 9, which does not fit 7 rows and 9 columns'):
        open_run(["a.npz"], METRES, folder=tmp_path)
    np.savez(tmp_path / "b.npz", x=X[[0, 2, 1, 3, 4, 5, 6, 7, 8]], y=Y, u=U, v=V)
    with pytest.raises(InputError, match=r"b\.npz: the x axis neither rises nor falls"):
        open_run(["b.npz"], METRES, folder=tmp_path)
