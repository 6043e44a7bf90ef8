"""Ledger, quantities, readout and time strip."""

import threading
import time

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QLineEdit

from fieldview.compute.field import Status
from fieldview.gui.panels.quantities import CARD
from fieldview.session.replay import Workbench, history
from fieldview.session.steps import Fill, MedianTest, SpreadTest
from tests.gui.conftest import FRAMES, action, key, move, settle


def test_ledger_says_what_each_line_did(window):
    tallies = Workbench(window.session).tallies(0)
    for line, tally in zip(window.ledger.lines, tallies, strict=True):
        assert tally.outcome in line.outcome.text()
    assert "Median test" in window.ledger.lines[0].title.text()


def test_a_switch_takes_a_line_out_and_undo_puts_it_back(window, qtbot):
    rejected = window.desk.picture.tallies[0].counts["rejected"]
    assert rejected >= 1
    QTest.mouseClick(window.ledger.lines[0].switch, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert window.session.ledger[0].on is False
    assert window.ledger.lines[0].outcome.text() == "switched off"
    action(window, "edit.undo").trigger()
    settle(qtbot, window)
    assert window.desk.picture.tallies[0].counts["rejected"] == rejected


def test_settings_open_in_place_and_edit_the_step(window, qtbot):
    line = window.ledger.lines[0]
    QTest.mouseClick(line, Qt.MouseButton.LeftButton)
    assert line.form.isVisible()
    entry = line.form.findChild(QLineEdit, "form.threshold")
    entry.selectAll()
    QTest.keyClicks(entry, "3,5")
    QTest.keyClick(entry, Qt.Key.Key_Return)
    assert window.session.ledger[0].threshold == 3.5
    entry.selectAll()
    QTest.keyClicks(entry, "-1")
    QTest.keyClick(entry, Qt.Key.Key_Return)
    assert window.session.ledger[0].threshold == 3.5, "what is not valid changes nothing"
    assert entry.property("wrong") is True
    assert "threshold" in line.form._problem.text()
    action(window, "edit.undo").trigger()
    assert window.session.ledger[0].threshold == 2.0
    assert entry.text() == "2"


def test_steps_are_added_moved_and_removed(window, qtbot):
    menu = window.ledger.add.menu()
    next(a for a in menu.actions() if a.text() == "Spread test").trigger()
    assert [type(s) for s in window.session.ledger] == [MedianTest, SpreadTest, Fill]
    line = window.ledger.lines[1]
    QTest.keyClick(line, Qt.Key.Key_Up, Qt.KeyboardModifier.AltModifier)
    assert [type(s) for s in window.session.ledger] == [SpreadTest, MedianTest, Fill]
    QTest.keyClick(window.ledger.lines[0], Qt.Key.Key_Delete)
    assert [type(s) for s in window.session.ledger] == [MedianTest, Fill]
    settle(qtbot, window)


def test_the_as_of_mark_shows_the_field_before_later_lines(window, qtbot):
    from fieldview.compute.field import Status
    from fieldview.gui import ledger_edits

    assert window.desk.picture.field.count(Status.REJECTED) == 0
    ledger_edits.as_of(window.desk, 0)
    settle(qtbot, window)
    assert window.desk.picture.field.count(Status.REJECTED) >= 1
    assert "as-of" in window.ledger.lines[1].outcome.text()
    ledger_edits.as_of(window.desk, 0)
    settle(qtbot, window)
    assert window.desk.picture.field.count(Status.REJECTED) == 0


def test_the_mark_is_pulled_and_lines_are_dragged(window, qtbot):
    from PySide6.QtCore import QPoint
    from PySide6.QtWidgets import QApplication

    mark, lines = window.ledger.mark, window.ledger.lines
    up = mark.mapFromGlobal(lines[1].mapToGlobal(QPoint(10, 2)))
    QTest.mousePress(mark, Qt.MouseButton.LeftButton, pos=QPoint(10, 4))
    QTest.mouseRelease(mark, Qt.MouseButton.LeftButton, pos=up)
    assert window.desk.picture.shown.as_of == 1
    QTest.keyClick(mark, Qt.Key.Key_Down)
    assert window.desk.picture.shown.as_of is None
    settle(qtbot, window)
    QApplication.processEvents()
    first = window.session
    grip = QPoint(60, 8)
    below = lines[0].mapFromGlobal(lines[1].mapToGlobal(lines[1].rect().bottomLeft()))
    QTest.mousePress(lines[0], Qt.MouseButton.LeftButton, pos=grip)
    QTest.mouseRelease(lines[0], Qt.MouseButton.LeftButton, pos=below)
    assert [type(s) for s in window.session.ledger] == [Fill, MedianTest]
    assert action(window, "edit.undo").text() == "Undo move median test"
    action(window, "edit.undo").trigger()
    assert window.session == first
    settle(qtbot, window)


def test_cards_show_the_range_of_the_very_quantity(window, qtbot):
    from fieldview.compute.quantities import quantity

    cards = [window.quantities.model.index(i).data(CARD) for i in range(window.quantities.model.rowCount())]
    assert [c.name for c in cards[:3]] == ["speed", "vorticity", "divergence"]
    field = window.desk.picture.field
    for card in cards:
        values = quantity(field, card.name)
        assert card.low == np.nanmin(values)
        assert card.high == np.nanmax(values)


def test_a_click_on_a_card_shows_its_map_and_buttons_its_lines(window, qtbot):
    view = window.quantities.view
    index = window.quantities.model.index(2)
    QTest.mouseClick(view.viewport(), Qt.MouseButton.LeftButton, pos=view.visualRect(index).center())
    settle(qtbot, window)
    assert window.desk.picture.map.name == "divergence"
    assert "∇·u" in window.canvas.colour_bar._bar.label
    QTest.mouseClick(window.quantities.iso, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert window.desk.picture.iso_now.name == "divergence"
    QTest.mouseClick(window.quantities.tint, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert window.desk.picture.tint_now.name == "divergence"
    QTest.mouseClick(window.quantities.iso, Qt.MouseButton.LeftButton)
    assert window.desk.picture.shown.iso_lines is None


def test_readout_tells_the_node_and_its_history(window):
    window.canvas.setFocus()
    move(window, 7 * 0.002, 5 * 0.002, held=False)
    field = window.desk.picture.field
    rows = dict((row[0].text, row[1].text) for row in window.readout.model.rows)
    assert rows["node"] == "row 5, col. 7"
    assert rows["status"] == "filled"
    told = window.readout.history.text().lower()
    for sentence in history(field, 5, 7):
        assert sentence.lower() in told
    assert "line 1" in told and "line 2" in told
    move(window, -0.02, 0.03, held=False)
    assert window.readout.history.text() == ""


def test_arrow_keys_step_through_the_frames(window, qtbot):
    for pressed, frame in (
        (Qt.Key.Key_Right, 1),
        (Qt.Key.Key_Right, 2),
        (Qt.Key.Key_Left, 1),
        (Qt.Key.Key_End, FRAMES - 1),
        (Qt.Key.Key_Right, FRAMES - 1),
        (Qt.Key.Key_Home, 0),
    ):
        key(window, pressed)
        assert window.desk.picture.shown.frame == frame
    settle(qtbot, window)
    assert not action(window, "edit.undo").isEnabled(), "looking is no edit"


def test_the_strip_is_scrubbed_with_the_mouse(window, qtbot):
    ruler = window.time_strip.ruler
    for frame in (3, 1):
        at = ruler.rect().center()
        at.setX(round(ruler.frame_x(frame)))
        QTest.mouseClick(ruler, Qt.MouseButton.LeftButton, pos=at)
        assert window.desk.picture.shown.frame == frame
    settle(qtbot, window)
    assert set(window.desk.picture.shares) >= {0, 1}


def test_a_tap_on_space_plays(window, qtbot):
    window.time_strip._clock.setInterval(5)
    QTest.keyClick(window.canvas, Qt.Key.Key_Space)
    assert window.time_strip.playing
    seen = set()

    def went_round():
        seen.add(window.desk.picture.field_frame)
        return len(seen) == FRAMES

    qtbot.waitUntil(went_round, timeout=10_000)
    QTest.keyClick(window.canvas, Qt.Key.Key_Space)
    assert not window.time_strip.playing
    settle(qtbot, window)


def test_regions_are_followed_over_the_run(window, qtbot):
    from fieldview.gui.panels.traces import trace_of
    from fieldview.session.measure import measure

    QTest.mouseClick(window.time_strip.follow, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    found = trace_of(window.desk.picture, "core")
    printed = [f["regions"][0]["circulation"]["value"] for f in measure(window.session)]
    assert [value for _, value, _ in found] == printed


def test_the_mean_is_shown_as_a_frame_like_any_other(window, qtbot):
    from fieldview.session.measure import measure

    QTest.mouseClick(window.time_strip._sources["mean"], Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    printed = measure(window.session, frames="mean")[0]["regions"][0]
    shown = window.desk.picture.measured_of(window.session.regions[0]).row
    assert shown == printed


def test_the_fluctuation_is_the_frame_less_the_mean(window, qtbot):
    from fieldview.session.measure import measure

    window.desk.go_to(2)
    settle(qtbot, window)
    QTest.mouseClick(window.time_strip._sources["fluctuation"], Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert "less the mean" in window.status.frame.text()
    for frame in (2, 0):
        window.desk.go_to(frame)
        settle(qtbot, window)
        shown = window.desk.picture.measured_of(window.session.regions[0]).row
        assert shown == measure(window.session, frames=f"fluctuation:{frame}")[0]["regions"][0]
    # against the definition
    bench = Workbench(window.session)
    frames = [bench.field(frame) for frame in range(FRAMES)]
    measured = [np.where(f.status == Status.MEASURED, f.u, np.nan) for f in frames]
    expected = frames[0].u - np.ma.masked_invalid(measured).mean(axis=0).filled(np.nan)
    np.testing.assert_allclose(window.desk.picture.field.u, expected, atol=1e-12)


def test_work_over_the_run_shows_its_progress_and_can_be_cancelled(window, qtbot, monkeypatch):
    from fieldview.gui import status_line, work

    began = threading.Event()

    def endless(bench, as_of, report):
        while True:
            began.set()
            report(0.25)
            time.sleep(0.005)

    monkeypatch.setattr(work, "mean_over_run", endless)
    monkeypatch.setattr(status_line, "PATIENCE", 0.0)
    before = window.desk.picture.field
    QTest.mouseClick(window.time_strip._sources["mean"], Qt.MouseButton.LeftButton)
    qtbot.waitUntil(lambda: began.is_set() and window.status.work.cancel.isVisible())
    qtbot.waitUntil(lambda: "left" in window.status.work.text.text())
    QTest.mouseClick(window.status.work.cancel, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert window.desk.picture.shown.source == "frame"
    assert window.desk.picture.field is not None and window.desk.picture.field_frame == 0
    assert np.array_equal(window.desk.picture.field.u, before.u, equal_nan=True)


def test_the_trace_shows_circulation_or_flux(window, qtbot):
    from fieldview.gui.panels.traces import trace_of
    from fieldview.session.measure import measure

    window.desk.show(selected="core", drawer="over_time")
    window.desk.follow()
    settle(qtbot, window)
    box = window.time_strip.trace
    box.setFocus()
    QTest.keyClick(box, Qt.Key.Key_Down)
    box.activated.emit(1)
    printed = [f["regions"][0]["flux"]["value"] for f in measure(window.session)]
    assert [value for _, value, _ in trace_of(window.desk.picture, "core")] == printed
    assert window.drawer.plot.getAxis("left").labelText.startswith("Φ")


def test_a_row_opens_to_its_budget(window, qtbot):
    view = window.regions.view
    view.setFocus()
    view.setCurrentIndex(window.regions.model.index(0, 1))
    QTest.keyClick(view, Qt.Key.Key_Return)
    assert window.desk.picture.shown.drawer == "budget"
    settle(qtbot, window)


def test_a_colour_range_is_typed(window, qtbot):
    from fieldview.gui.colour_sheet import ColourSheet

    action(window, "view.colour_range").trigger()
    sheet = window.findChild(ColourSheet)
    for entry, text in ((sheet.low, "-5"), (sheet.high, "20")):
        entry.selectAll()
        QTest.keyClicks(entry, text)
    QTest.keyClick(sheet.high, Qt.Key.Key_Return)
    assert window.desk.picture.shown.levels["vorticity"] == (-5.0, 20.0)
    entry = sheet.low
    entry.selectAll()
    QTest.keyClicks(entry, "30")
    QTest.keyClick(entry, Qt.Key.Key_Return)
    assert "first below the last" in sheet.problem.text()
    assert window.desk.picture.shown.levels["vorticity"] == (-5.0, 20.0)
    sheet.close()
    settle(qtbot, window)
