"""What is set once: errors, calibration, axes."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QDialogButtonBox, QLineEdit, QPushButton

from fieldview.gui.calibration_sheet import CalibrationSheet
from fieldview.gui.uncertainty_sheet import UncertaintySheet
from fieldview.session.models import RunSource, Session
from fieldview.session.regions import Circle, Line
from fieldview.session.store import save_session
from tests.gui.conftest import action, click, key, settle, vortex_frame


def typed(entry: QLineEdit, text: str) -> None:
    entry.setFocus()
    entry.selectAll()
    QTest.keyClick(entry, Qt.Key.Key_Delete)
    QTest.keyClicks(entry, text)


def press(sheet, text: str) -> None:
    button = next(b for b in sheet.findChildren(QPushButton) if b.text() == text)
    QTest.mouseClick(button, Qt.MouseButton.LeftButton)


@pytest.fixture
def errors_sheet(window):
    action(window, "sheet.uncertainty").trigger()
    sheet = window.findChild(UncertaintySheet)
    assert not sheet.isModal()
    yield sheet
    sheet.close()


def test_the_sheet_shows_what_the_session_says(errors_sheet):
    assert errors_sheet.source.currentData() == "given"
    assert [e.text() for e in errors_sheet.sigma.values()] == ["0.002"] * 3
    assert [e.text() for e in errors_sheet.nodes] == ["1", "1"]
    assert [e.text() for e in errors_sheet.window_size] == ["", ""]


def test_errors_are_changed_in_one_step(window, errors_sheet, qtbot):
    first = window.session
    typed(errors_sheet.sigma["v"], "0,004")
    errors_sheet.overlap.setCurrentIndex(3)
    errors_sheet.overlap.activated.emit(3)
    typed(errors_sheet.parts["scale"], "0.003")
    press(errors_sheet, "Apply")
    model = window.session.error_model
    assert model.sigma == {"u": 0.002, "v": 0.004, "w": 0.002}
    assert model.correlation_nodes == 2.0
    assert model.systematic.scale == 0.003
    action(window, "edit.undo").trigger()
    assert window.session == first
    assert errors_sheet.sigma["v"].text() == "0.002", "the sheet follows undo"


def test_what_cannot_be_is_said_in_the_sheet(window, errors_sheet):
    first = window.session
    typed(errors_sheet.nodes[0], "-1")
    typed(errors_sheet.nodes[1], "-1")
    press(errors_sheet, "Apply")
    assert "positive" in errors_sheet.problem.text()
    assert window.session == first


@pytest.fixture
def pixel_window(open_window, tmp_path):
    """A run in pixels: 16 px apart, pixels per pulse."""
    rows = vortex_frame(0, outlier=False)
    rows[:, :2] *= 8000
    rows[:, 2:] *= 40
    lines = ["x [px],y [px],u [px],v [px]"] + [",".join(f"{v:.9g}" for v in row) for row in rows]
    (tmp_path / "p.csv").write_text("\n".join(lines))
    regions = (
        Circle(name="core", centre=(320, 240), radius=120),
        Line(name="ruler", points=((100, 100), (500, 100))),
    )
    session = Session(units="px, pulse", run=RunSource(files=("p.csv",)), regions=regions)
    save_session(session.in_folder(tmp_path), tmp_path / "p.session.json")
    return open_window(tmp_path / "p.session.json")


def test_a_known_distance_calibrates_everything_in_one_step(pixel_window, qtbot):
    window, first = pixel_window, pixel_window.session
    window.desk.show(selected="ruler")
    action(window, "sheet.calibration").trigger()
    sheet = window.findChild(CalibrationSheet)
    press(sheet, "From the chosen line")
    assert sheet.pixels.text() == "400"
    typed(sheet.distance, "40")
    press(sheet, "Use")
    typed(sheet.pulse, "2.5")
    press(sheet, "Apply")
    assert sheet.problem.text() == ""
    assert window.session.units == "m, s"
    assert window.session.regions[0].radius == pytest.approx(0.012)
    assert window.session.ledger[0].metres_per_pixel == pytest.approx(1e-4)
    settle(qtbot, window)
    notice = window.desk.picture.notice
    assert notice is None or not notice.grave, window.banner.text.text()
    assert str(window.desk.picture.field.units) == "m, s"
    row = window.desk.picture.measured_of(window.session.regions[0]).row
    assert row["circulation"]["unit"] == "m^2/s"
    assert window.canvas.plot.getAxis("bottom").labelText.endswith("[m]")
    action(window, "edit.undo").trigger()
    assert window.session == first
    settle(qtbot, window)
    assert str(window.desk.picture.field.units) == "px, pulse"
    sheet.close()


def test_a_reflection_says_what_becomes_of_the_vorticity(window, qtbot):
    action(window, "sheet.calibration").trigger()
    sheet = window.findChild(CalibrationSheet)
    assert "counter-clockwise (+) now and stays so" in sheet.sign.text()
    sheet.reflect.setCurrentIndex(1)
    sheet.reflect.activated.emit(1)
    assert "would read clockwise (−)" in sheet.sign.text()
    before = window.desk.picture.measured_of(window.session.regions[0]).row["circulation"]["value"]
    press(sheet, "Apply")
    settle(qtbot, window)
    assert window.desk.picture.notice is None, window.banner.text.text()
    assert window.session.ledger[0].reflect == "x"
    assert "clockwise (−) now and stays so" in sheet.sign.text()
    assert before > 0
    sheet.buttons.button(QDialogButtonBox.StandardButton.Close).click()


def test_a_distance_and_the_origin_are_clicked_on_the_canvas(pixel_window, qtbot):
    window, first = pixel_window, pixel_window.session
    action(window, "sheet.calibration").trigger()
    sheet = window.findChild(CalibrationSheet)
    press(sheet, "Click on the canvas")
    click(window, 100, 200)
    click(window, 500, 200)
    assert float(sheet.pixels.text()) == pytest.approx(400, abs=2)
    assert window.session == first, "pointing out a distance changes nothing"
    typed(sheet.distance, "40")
    press(sheet, "Use")
    typed(sheet.pulse, "2.5")
    press(sheet, "Click")
    key(window, Qt.Key.Key_Escape)
    assert sheet.origin[0].text() == "", "Esc gives up"
    press(sheet, "Click")
    click(window, 320, 240)
    column, row = (float(entry.text()) for entry in sheet.origin)
    assert (column, row) == (pytest.approx(320, abs=1), pytest.approx(240, abs=1))
    press(sheet, "Apply")
    settle(qtbot, window)
    assert window.session.regions[0].centre == (pytest.approx(0, abs=2e-4), pytest.approx(0, abs=2e-4))
    # pointed out again in metres, the distance still reads in pixels
    press(sheet, "Click on the canvas")
    click(window, -0.01, 0.0)
    click(window, 0.02, 0.0)
    assert float(sheet.pixels.text()) == pytest.approx(300, abs=3)
    sheet.close()


def test_correlated_nodes_follow_from_the_measuring_window(window, errors_sheet, qtbot):
    for entry in errors_sheet.window_size:
        typed(entry, "0.004")
    press(errors_sheet, "Nodes from it")
    press(errors_sheet, "Apply")
    assert window.session.error_model.correlation_nodes == pytest.approx(2.0), "4 mm over 2 mm"
    assert window.session.error_model.window == 0.004
    settle(qtbot, window)


def test_the_sheet_shows_the_budget_and_the_coverage(window, errors_sheet, qtbot):
    window.desk.show(selected="core")
    assert errors_sheet.of_region.text() == "Budget of core"
    assert errors_sheet.budget.model.rows[0][0].text == "scatter of the vectors"
    errors_sheet.coverage.setFocus()
    QTest.keyClick(errors_sheet.coverage, Qt.Key.Key_Down)
    errors_sheet.coverage.activated.emit(1)
    assert window.desk.picture.shown.coverage == 2.0
    assert errors_sheet.budget.model.titles[1] == "± U, k = 2"
