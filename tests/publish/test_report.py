"""The report: valid, self-contained, escaped, the same bytes every time, and true to the numbers."""

import json
import re

import html5lib
import pytest

from fieldview import cli
from fieldview.publish import wording
from fieldview.session.measure import measure
from fieldview.session.store import load_session, save_session
from tests.session.runs import SIGMA, edited, vortex_frames

HOSTILE = "<script>alert('x')</script> & \"quotes\" </title>"
REGIONS = [
    {"name": "core", "shape": "circle", "centre": [0.02, 0.016], "radius": 0.008},
    {"name": HOSTILE, "shape": "line", "points": [[0.02, 0.004], [0.02, 0.03]]},
]
MODEL = {"sigma": SIGMA, "correlation_nodes": 1, "window": 0, "systematic": {"scale": 0.003}}


@pytest.fixture(scope="module")
def session_path(tmp_path_factory):
    folder = tmp_path_factory.mktemp("run")
    session = edited(
        vortex_frames(folder, 5),
        title=HOSTILE,
        regions=REGIONS,
        error_model=MODEL,
        ledger=[{"step": "median_test"}, {"step": "fill"}],
    )
    save_session(session, folder / "v.session.json")
    return folder / "v.session.json"


@pytest.fixture(scope="module")
def page(session_path, tmp_path_factory) -> str:
    out = tmp_path_factory.mktemp("out") / "r.html"
    assert cli.run(["report", str(session_path), "--out", str(out), "--choices"]) == 0
    return out.read_text()


def test_it_is_valid_html_without_anything_from_outside(page):
    html5lib.HTMLParser(strict=True).parse(page)
    assert not re.search(r"""(src|href)=["'](?!data:|#)""", page) and "@import" not in page
    assert "<script" not in page and "url(" not in page
    assert "default-src 'none'" in page


def test_hostile_names_are_text(page):
    tree = html5lib.parse(page, namespaceHTMLElements=False)
    assert tree.find(".//h1").text == HOSTILE
    assert tree.find(".//title").text.startswith(HOSTILE)
    assert any(HOSTILE in "".join(part.itertext()) for part in tree.iter("h3"))


def test_every_part_is_there(page):
    for title in (
        "The run",
        "How the files were read",
        "What was done to the vectors",
        "Error model",
        "Is the run good?",
        "Regions",
        "How much is the analyst?",
        "Figures",
        "Methods and their sources",
        "Cautions",
        "Versions",
    ):
        assert f"<h2>{title}</h2>" in page, title
    for part in ("Median test", "Westerweel", "JCGM 100:2008", "sha256:", "fume cupboards", "f4.csv"):
        assert part in page, part
    assert page.count("<figure>") == 3 and "Uncertainty budget, frame 0" in page


def test_its_numbers_are_those_of_measure(page, session_path):
    for row in measure(load_session(session_path)):
        number = row["regions"][0]["circulation"]
        shown = " ± ".join(wording.pair(number["value"], number["uncertainty"]["combined"]))
        assert f">{shown}<" in page
    shares = [float(word) for word in re.findall(r"</span> ([\d.]+) %", page.split("Uncertainty budget")[1])]
    assert shares and max(shares) > 30


def test_the_same_session_gives_the_same_bytes(session_path, tmp_path, page):
    out = tmp_path / "again.html"
    asked = ["report", str(session_path), "--out", str(out), "--choices", "--workers", "2"]
    assert cli.run(asked) == 0
    assert out.read_text() == page


def test_traverses_and_runs_without_regions_have_reports_too(tmp_path, session_path):
    session = load_session(session_path)
    bare = session.model_copy(update={"regions": (), "title": ""}).in_folder(session.folder)
    save_session(bare, tmp_path / "bare.session.json")
    out = tmp_path / "r.html"
    assert (
        cli.run(["report", str(tmp_path / "bare.session.json"), "--out", str(out), "--frames", "mean"]) == 0
    )
    text = out.read_text()
    html5lib.HTMLParser(strict=True).parse(text)
    assert "The session has no regions" in text and "1 of 5 frames: mean" in text


def test_bad_requests_are_one_sentence(session_path, tmp_path, capfd):
    for arguments, sentence in (
        (("--out", str(tmp_path / "r.pdf")), "must be .html"),
        (("--out", str(tmp_path / "no" / "r.html")), "does not exist"),
        (("--out", str(tmp_path / "r.html"), "--frames", "77"), "the run has 5 frames"),
    ):
        assert cli.run(["report", str(session_path), *arguments]) == 2
        assert sentence in capfd.readouterr().err
    assert list(tmp_path.iterdir()) == []


def test_a_single_row_of_nodes_has_a_report(tmp_path):
    (tmp_path / "row.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,1,0\n0.1,0,2,0\n0.2,0,3,1\n")
    session = {"format": "loopflux-session", "version": 1, "run": {"files": ["row.csv"]}}
    session["regions"] = [{"name": "line", "shape": "line", "points": [[0, 0], [0.2, 0]]}]
    (tmp_path / "row.session.json").write_text(json.dumps(session))
    out = tmp_path / "r.html"
    assert cli.run(["report", str(tmp_path / "row.session.json"), "--out", str(out)]) == 0
    html5lib.HTMLParser(strict=True).parse(out.read_text())
    assert "∫u·dl" in out.read_text()
