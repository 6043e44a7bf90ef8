"""Figures: what is drawn is what was measured, the same bytes every time, with the fonts inside."""

import io
import os
import re

import numpy as np
import pytest
from PIL import Image

from fieldview import cli
from fieldview.compute.errors import InputError
from fieldview.compute.growth import around, growth_curve
from fieldview.compute.quantities import quantity
from fieldview.publish import wording
from fieldview.publish.figures import animate, caption, draw, picture
from fieldview.publish.figures.curves import FACTORS
from fieldview.publish.figures.making import changed_settings
from fieldview.session.convert import set_calibration
from fieldview.session.figures import FigureSettings
from fieldview.session.measure import measure
from fieldview.session.models import Session
from fieldview.session.replay import Workbench
from fieldview.session.steps import Calibrate
from fieldview.session.store import dump_session, parse_session, save_session
from fieldview.session.traces import region_trace
from fieldview.shipped import shipped_folder
from tests.session.runs import SIGMA, edited, pulsing_frames

REGIONS = [
    {"name": "core", "shape": "circle", "centre": [0.02, 0.016], "radius": 0.008},
    {"name": "cut $5 & 10%_^", "shape": "line", "points": [[0.02, 0.002], [0.02, 0.03]]},
]
MASK = {"step": "mask", "region": {"shape": "circle", "centre": [0.034, 0.028], "radius": 0.004}}


@pytest.fixture(scope="module")
def session(tmp_path_factory) -> Session:
    folder = tmp_path_factory.mktemp("run")
    made = pulsing_frames(folder, 2)
    text = (folder / "f0.csv").read_text().splitlines()
    # an outlier that is rejected and filled, and a gap at the edge that cannot be filled
    text[1 + 5 * 21 + 5] = re.sub(r"^([^,]*,[^,]*),[^,]*", r"\1,3.0", text[1 + 5 * 21 + 5])
    text[1 + 16 * 21] = re.sub(r"^([^,]*,[^,]*),[^,]*,[^,]*", r"\1,,", text[1 + 16 * 21])
    (folder / "f0.csv").write_text("\n".join(text) + "\n")
    ledger = [MASK, {"step": "median_test", "floor": SIGMA, "threshold": 4.0}, {"step": "fill"}]
    return edited(made, regions=REGIONS, ledger=ledger, title="Invented vortex")


@pytest.fixture(scope="module")
def bench(session) -> Workbench:
    return Workbench(session, cache_bytes=100_000_000)


def texts(figure) -> list[str]:
    from matplotlib.text import Text

    return [text.get_text() for text in figure.findobj(Text) if text.get_text()]


def test_a_map_shows_the_values_the_arrows_and_the_numbers(bench, session):
    settings = FigureSettings(quantities=("vorticity",), arrow_spacing_mm=3.0)
    figure = draw(bench, settings)
    field = bench.field(0)
    axes, bar = figure.axes
    (image,) = axes.images
    np.testing.assert_array_equal(image.get_array().filled(np.nan), quantity(field, "vorticity"))
    assert image.norm.vmin == -image.norm.vmax, "signed quantities have symmetric colours"
    assert bar.get_ylabel() == "ω [1/s]" and axes.get_xlabel() == "x [mm]"
    from matplotlib.quiver import Quiver

    quivers = axes.findobj(Quiver)
    spacing = [np.diff(np.unique(arrows.X)).min() for arrows in quivers if arrows.X.size > 5]
    per_mm = np.ptp(axes.get_xlim()) / (axes.get_position().width * settings.width_mm)
    assert all(step / per_mm >= 3.0 for step in spacing)
    arrows = quivers[0]
    row, column = round(arrows.Y[3] / 2), round(arrows.X[3] / 2)
    assert arrows.U[3] == field.u[row, column] and arrows.V[3] == field.v[row, column]
    said = texts(figure)
    numbers = measure(session, 0)[0]["regions"][0]["circulation"]
    shown = wording.plus_minus(numbers["value"], numbers["uncertainty"]["combined"], "m^2/s")
    assert any(shown in line.replace("\n", " ") for line in said)
    assert {"filled", "rejected", "masked"} <= set(said)
    assert any(re.fullmatch(r"[\d.]+ m/s", line) for line in said), "the reference arrow has its speed"


def test_panels_share_one_scale_of_colours(bench):
    figure = draw(bench, FigureSettings(frames="0,4", quantities=("u", "v"), width_mm=175))
    *panels, _bar = figure.axes
    assert len(panels) == 4
    norms = {(axes.images[0].norm.vmin, axes.images[0].norm.vmax) for axes in panels}
    assert len(norms) == 1
    assert any("u, frame 4, t = 0.25 s" in text for text in texts(figure))


def test_turned_and_uneven_axes_are_drawn_where_they_are(session):
    turned = edited(session, ledger=[{"step": "turn_axes", "angle_deg": 30.0}], regions=[])
    figure = draw(Workbench(turned), FigureSettings(marks=False))
    axes = figure.axes[0]
    (image,) = axes.images
    box = image.get_transform().transform([[0, 0], [0.04, 0.0]])
    along = np.diff(axes.transData.inverted().transform(box), axis=0)[0]
    assert np.degrees(np.arctan2(along[1], along[0])) == pytest.approx(-30, abs=1e-9) or np.degrees(
        np.arctan2(along[1], along[0])
    ) == pytest.approx(30, abs=1e-9)
    nodes = Workbench(turned).field(0).grid.nodes
    x0, x1 = axes.get_xlim()
    assert x0 <= 1e3 * nodes.real.min() and 1e3 * nodes.real.max() <= x1


def test_curves_are_those_of_the_functions(bench, session):
    core = session.regions[0].outline()
    field = bench.field(0)
    line = draw(bench, FigureSettings(kind="growth")).axes[0].lines[-1]
    curve = growth_curve(field, core, FACTORS)
    values = [number.value for number in curve.circulation]
    np.testing.assert_array_equal(line.get_ydata(), np.array(values, float))
    first, second = draw(bench, FigureSettings(kind="around")).axes[0].lines[-2:]
    found = around(field, core)
    np.testing.assert_array_equal(first.get_ydata(), found.tangential)
    np.testing.assert_array_equal(second.get_ydata(), found.normal)
    assert len(draw(bench, FigureSettings(kind="profile")).axes[0].lines) == 3
    trace = region_trace(bench, "core")
    line = draw(bench, FigureSettings(kind="time")).axes[0].lines[-1]
    np.testing.assert_array_equal(line.get_ydata(), trace.values)
    np.testing.assert_array_equal(line.get_xdata(), trace.times)
    spectrum = draw(bench, FigureSettings(kind="spectrum")).axes[0]
    assert spectrum.get_xlabel() == "frequency [Hz]" and "m⁴/s² s" in spectrum.get_ylabel()
    probe = FigureSettings(kind="convergence", probe=(0.025, 0.016), quantities=("v",))
    mean = draw(bench, probe).axes[0].lines[-1].get_ydata()
    assert mean[-1] == pytest.approx(np.mean([bench.field(n).v[8, 12] * 0.5 + bench.field(n).v[8, 13] * 0.5
        for n in range(16)]))  # fmt: skip


@pytest.mark.parametrize("ending", ["pdf", "svg", "png"])
def test_the_same_figure_is_the_same_bytes(bench, ending, monkeypatch):
    settings = FigureSettings(dpi=80)
    monkeypatch.delenv("SOURCE_DATE_EPOCH", raising=False)
    one, two = (picture(draw(bench, settings), settings, ending) for _ in range(2))
    assert one == two and len(one) > 5000
    for year in (b"202", b"CreationDate"):
        assert ending == "png" or year not in one.split(b"<metadata")[0][:400] or ending == "pdf"
    if ending == "pdf":
        assert b"/CreationDate" not in one
        monkeypatch.setenv("SOURCE_DATE_EPOCH", "86400")
        assert b"/CreationDate (D:19700102" in picture(draw(bench, settings), settings, ending)


def test_fonts_are_inside_the_pdf(bench):
    settings = FigureSettings()
    content = picture(draw(bench, settings), settings, "pdf")
    fonts = re.findall(rb"/BaseFont /(\S+)", content)
    assert fonts and content.count(b"/FontFile2") >= 1 and b"/Type3" not in content
    width = float(re.search(rb"/MediaBox \[ 0 0 (\S+)", content)[1])
    assert width == pytest.approx(85 / 25.4 * 72, abs=0.01)


def test_settings_are_part_of_the_session(session, tmp_path):
    assert "figures" not in dump_session(session)
    kept = edited(session, figures=[{"name": "one", "quantities": ["speed"], "width_mm": 175}])
    again = parse_session(dump_session(kept))
    assert again.figures[0].quantities == ("speed",) and again.figures[0].width_mm == 175
    for wrong in ({"name": "one", "colour": 1}, {"name": "one", "width_mm": 5}, {"low": 2.0, "high": 1.0}):
        with pytest.raises(ValueError, match="figures"):
            edited(session, figures=[wrong])
    with pytest.raises(ValueError, match="two figures"):
        edited(session, figures=[{"name": "a"}, {"name": "a"}])


def test_a_calibration_takes_the_figures_along(tmp_path):
    session = Session.model_validate(
        {"format": "loopflux-session", "version": 1, "run": {"files": ["a.csv"]}, "units": "px, pulse",
         "figures": [{"name": "f", "probe": [100, 50], "low": -1.0, "high": 1.0}]}
    )  # fmt: skip
    step = Calibrate(metres_per_pixel=1e-4, pulse_separation=0.01)
    (figure,) = set_calibration(session, step).figures
    assert figure.probe == pytest.approx((0.01, 0.005)) and figure.high == pytest.approx(100.0)


def test_the_caption_says_what_was_done(bench, session):
    text = caption(bench, FigureSettings())
    for part in ("Vorticity ω [1/s]", "frame 0", "Γ = ", "masked", "Median test", "(k = 1)", "sha256:"):
        assert part in text, part
    assert text.count("\n") == 1
    assert "growth" not in caption(bench, FigureSettings(kind="growth"))


def test_moving_pictures(bench, tmp_path):
    settings = FigureSettings(frames="0:3", dpi=50, width_mm=60, regions=False)
    for ending in ("gif", "apng"):
        path = tmp_path / f"a.{ending}"
        animate(bench, settings, path, rate=4)
        with Image.open(path) as moving:
            assert moving.n_frames == 3 and moving.info["duration"] == 250
        first = path.read_bytes()
        animate(bench, settings, path, rate=4)
        assert path.read_bytes() == first
    assert sorted(os.listdir(tmp_path)) == ["a.apng", "a.gif"]


@pytest.mark.parametrize(
    ("settings", "sentence"),
    [
        ({"quantities": ("luck",)}, "is not known"),
        ({"quantities": ("u", "vorticity")}, "different units"),
        ({"iso_lines": "luck"}, "not known"),
        ({"frames": "99"}, "the run has 16 frames"),
        ({"kind": "growth", "region": "tub"}, "no region"),
        ({"kind": "growth", "region": "cut $5 & 10%_^"}, "is a line"),
        ({"kind": "profile", "region": "core"}, "needs a line"),
        ({"kind": "growth", "frames": "0,1"}, "shows one frame"),
        ({"columns": 2, "frames": "0,1", "width_mm": 30.0, "font_pt": 12.0}, "side by side leave"),
        ({"height_mm": 20.0}, "no room"),
    ],
)
def test_what_cannot_be_drawn_is_one_sentence(bench, settings, sentence):
    with pytest.raises(InputError, match=sentence):
        draw(bench, FigureSettings(**settings))


def test_names_with_signs_of_formulas_are_drawn_as_they_are(bench):
    settings = FigureSettings(title=r"$\frac{ & <b>", width_mm=120)
    content = picture(draw(bench, settings), settings, "svg")
    assert content.startswith(b"<?xml")


def test_the_command(session, tmp_path, capfd):
    path = tmp_path / "s.session.json"
    save_session(edited(session, figures=[{"name": "two", "kind": "growth"}]), path)

    def run(*arguments):
        status = cli.run(["figure", str(path), *map(str, arguments)])
        return status, capfd.readouterr().err

    out = tmp_path / "f.png"
    assert run("--out", out, "--caption", tmp_path / "f.txt", "--width", "one", "--dpi", "100") == (0, "")
    with Image.open(io.BytesIO(out.read_bytes())) as image:
        assert abs(image.width - 85 / 25.4 * 100) <= 1
    assert "scaled about its centroid" in (tmp_path / "f.txt").read_text()
    assert run("--out", tmp_path / "m.svg", "--kind", "map", "--quantity", "speed", "--frame", "mean")[0] == 0
    assert run("--out", tmp_path / "m.gif", "--kind", "map", "--frames", "0:2", "--dpi", "50")[0] == 0
    before = sorted(os.listdir(tmp_path))
    for arguments, sentence in (
        (("--out", tmp_path / "f.doc"), "the ending must be"),
        (("--out", tmp_path / "no" / "f.pdf"), "its folder does not exist"),
        (("--out", tmp_path / "g.pdf", "--figure", "three"), 'no figure "three"'),
        (("--out", tmp_path / "g.pdf", "--kind", "cake"), "figure, kind"),
        (("--out", tmp_path / "g.pdf", "--width", "broad"), "one, two, or a width"),
        (("--out", tmp_path / "g.pdf", "--width", "5"), "figure, width_mm"),
        (("--out", tmp_path / "g.gif", "--kind", "map", "--frame", "0"), "two frames or more"),
        (("--out", tmp_path / "g.gif", "--rate", "0", "--kind", "map"), "frames a second"),
    ):
        status, err = run(*arguments)
        assert status == 2 and sentence in err and err.count("\n") == 1
    assert sorted(os.listdir(tmp_path)) == before


def test_changed_settings_are_checked_as_a_session_s(bench):
    assert changed_settings(FigureSettings(), {"dpi": 72, "kind": None}).dpi == 72
    with pytest.raises(InputError, match="figure, dpi"):
        changed_settings(FigureSettings(), {"dpi": 1})


def test_a_run_across_the_plane_is_shown_by_its_component(tmp_path, capfd):
    path = shipped_folder("sample_sessions") / "hood_face/hood_face.session.json"
    assert cli.run(["figure", str(path), "--out", str(tmp_path / "h.svg")]) == 0
    assert cli.run(["figure", str(path), "--out", str(tmp_path / "g.svg"), "--kind", "growth"]) == 2
    assert "needs u and v" in capfd.readouterr().err
