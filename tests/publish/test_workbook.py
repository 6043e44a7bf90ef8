"""The workbook, read by another library: numbers as numbers, units beside them, no formulas."""

import openpyxl
import pytest

from fieldview import cli
from fieldview.publish.workbook import Sheet, workbook_bytes
from fieldview.session.measure import measure
from fieldview.session.store import load_session, save_session
from tests.session.runs import SIGMA, edited, vortex_frames

REGIONS = [
    {"name": "=1+core", "shape": "circle", "centre": [0.02, 0.016], "radius": 0.008},
    {"name": "cut", "shape": "line", "points": [[0.02, 0.004], [0.02, 0.03]]},
]


@pytest.fixture(scope="module")
def session_path(tmp_path_factory):
    folder = tmp_path_factory.mktemp("run")
    session = edited(
        vortex_frames(folder, 5),
        title="@invented",
        regions=REGIONS,
        error_model={"sigma": SIGMA, "correlation_nodes": 1, "window": 0},
        ledger=[{"step": "median_test"}, {"step": "fill"}],
    )
    save_session(session, folder / "v.session.json")
    return folder / "v.session.json"


def pages(path) -> dict[str, list[tuple]]:
    book = openpyxl.load_workbook(path)
    return {page.title: list(page.iter_rows(values_only=True)) for page in book}


def test_the_numbers_are_those_of_measure_with_units_and_uncertainties(session_path, tmp_path, capfd):
    out = tmp_path / "v.xlsx"
    assert cli.run(["workbook", str(session_path), "--out", str(out), "--frames", "0:4"]) == 0
    found = pages(out)
    assert list(found) == ["about", "regions", "run check", "frames", "statistics", "remarks"]
    titles, *rows = found["regions"]
    assert len(rows) == 2 * 4
    expected = measure(load_session(session_path), "0:4")
    for number, row in enumerate(rows[::2]):
        cells = dict(zip(titles, row, strict=True))
        wanted = expected[number]["regions"][0]["circulation"]
        assert cells["circulation"] == wanted["value"] and cells["circulation_unit"] == "m^2/s"
        assert cells["circulation_u_combined"] == wanted["uncertainty"]["combined"]
        assert cells["region"] == "'=1+core" and cells["frame"] == number
    about = dict(row[:2] for row in found["about"])
    assert about["title"] == "'@invented" and about["frames"] == "4 of 5" and "f3.csv" in about
    statistics = {row[0]: row for row in found["statistics"][1:]}
    assert {"mean_u", "reynolds_uv", "turbulent_kinetic_energy"} & set(statistics)
    assert len(found["frames"]) == 5 and isinstance(found["frames"][1][2], float)
    first = out.read_bytes()
    assert (
        cli.run(["workbook", str(session_path), "--out", str(out), "--frames", "0:4", "--workers", "2"]) == 0
    )
    assert out.read_bytes() == first, "the same whatever the number of workers, and at any time of day"


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@x", '=HYPERLINK("http://x")'])
def test_text_that_looks_like_a_formula_is_neutralised(text, tmp_path):
    sheet = Sheet("s", [["title"], [text], [-1.5], [None], [True]])
    (tmp_path / "a.xlsx").write_bytes(workbook_bytes([sheet]))
    page = openpyxl.load_workbook(tmp_path / "a.xlsx")["s"]
    assert page["A2"].value == f"'{text}" and page["A2"].data_type == "s"
    assert page["A3"].value == -1.5 and page["A4"].value is None and page["A5"].value is True


def test_bad_requests_are_one_sentence(session_path, tmp_path, capfd):
    for name, sentence in (("a.xls", "must be .xlsx"), ("no/a.xlsx", "does not exist")):
        assert cli.run(["workbook", str(session_path), "--out", str(tmp_path / name)]) == 2
        assert sentence in capfd.readouterr().err
    assert list(tmp_path.iterdir()) == []
