"""Files that do not say everything: asked in the reading sheet, drawn as they would be read, remembered."""

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from fieldview.gui.reading_sheet import ReadingSheet
from tests.gui.conftest import settle, vortex_frame

ROLES = {"a": "x", "b": "y", "c": "u", "d": "v"}


@pytest.fixture
def silent_file(tmp_path):
    """A file whose columns say nothing."""
    rows = vortex_frame(0, outlier=False)
    path = tmp_path / "shot.txt"
    np.savetxt(path, rows, header="a b c d", comments="")
    return path


def choose(box, value):
    """Choose an entry by keyboard, as a user does."""
    box.setFocus()
    place = box.findData(value)
    for _ in range(abs(place - box.currentIndex())):
        QTest.keyClick(box, Qt.Key.Key_Down if place > box.currentIndex() else Qt.Key.Key_Up)
    QTest.keyClick(box, Qt.Key.Key_Return)
    box.activated.emit(place)


def sheet_of(window, qtbot) -> ReadingSheet:
    qtbot.waitUntil(lambda: window.findChild(ReadingSheet) is not None)
    sheet = window.findChild(ReadingSheet)
    qtbot.waitUntil(lambda: bool(sheet.roles) and sheet.jobs.idle)
    return sheet


def answer(sheet, qtbot):
    for name, role in ROLES.items():
        choose(sheet.roles[name], role)
    for key, unit in (("length_unit", "m"), ("velocity_unit", "m/s")):
        entry = sheet.units[key].lineEdit()
        entry.setFocus()
        entry.selectAll()
        QTest.keyClicks(entry, unit)
        QTest.keyClick(entry, Qt.Key.Key_Return)
    qtbot.waitUntil(lambda: sheet.jobs.idle)


def test_what_a_file_does_not_say_is_asked_and_remembered(open_window, silent_file, qtbot):
    window = open_window(silent_file)
    sheet = sheet_of(window, qtbot)
    assert not sheet.isModal()
    assert QApplication.activeModalWidget() is None
    assert not sheet.open_button.isEnabled(), "nothing may be guessed"
    assert sheet.rows.rows[0][0].text == "a", "the file's own first rows are shown"
    answer(sheet, qtbot)
    assert sheet.open_button.isEnabled(), sheet.doubts.text()
    assert sheet.canvas.isVisible(), "the first frame is drawn as it would be read"
    assert "strongest vorticity" in sheet.doubts.text()
    QTest.mouseClick(sheet.open_button, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert window.session.units == "m, s"
    assert window.session.run.reading.columns == {role: name for name, role in ROLES.items()}
    assert window.desk.picture.field.grid.shape == (31, 41)

    # a file that looks the same is answered already
    again = silent_file.with_name("next.txt")
    again.write_text(silent_file.read_text())
    other = open_window(again)
    second = sheet_of(other, qtbot)
    qtbot.waitUntil(lambda: second.jobs.idle and second.open_button.isEnabled())
    assert second.roles["c"].currentData() == "u"
    assert second.units["length_unit"].currentText() == "m"
    second.close()


def test_a_run_that_is_open_can_be_read_differently_in_one_step(window, qtbot):
    first = window.session
    window.ask_reading()
    sheet = sheet_of(window, qtbot)
    choose(sheet.choices["v_positive"], "down")
    qtbot.waitUntil(lambda: sheet.jobs.idle)
    QTest.mouseClick(sheet.open_button, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert window.session.run.reading.v_positive == "down"
    window.desk.undo()
    assert window.session == first
    settle(qtbot, window)


def test_what_cannot_be_is_said_in_the_sheet(open_window, silent_file, qtbot):
    window = open_window(silent_file)
    sheet = sheet_of(window, qtbot)
    answer(sheet, qtbot)
    entry = sheet.numbers["pulse_separation"]
    entry.setFocus()
    QTest.keyClicks(entry, "soon")
    QTest.keyClick(entry, Qt.Key.Key_Return)
    assert "pulse separation" in sheet.problem.text()
    sheet.close()


def test_a_file_that_fails_leaves_what_was_open(window, silent_file, qtbot):
    before = window.session
    window.open([silent_file])
    sheet = sheet_of(window, qtbot)
    assert "shot.txt" in sheet.why.text()
    sheet.close()
    settle(qtbot, window)
    assert window.session == before
    assert window.desk.picture.field is not None
