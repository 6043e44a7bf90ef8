"""The drawer: curves, budget and coordinates of the chosen region."""

import numpy as np
import pytest
from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from fieldview.gui.panels.budget import budget_rows
from fieldview.session.measure import measure
from fieldview.session.regions import Line
from tests.gui.conftest import action, pixel, settle


@pytest.fixture
def chosen(window, qtbot):
    window.desk.show(selected="core")
    settle(qtbot, window)
    return window


def open_tab(window, qtbot, title):
    tabs = window.drawer.tabs
    place = next(i for i in range(tabs.count()) if tabs.tabText(i) == title)
    QTest.mouseClick(tabs, Qt.MouseButton.LeftButton, pos=tabs.tabRect(place).center())
    settle(qtbot, window)


def test_growth_passes_through_the_drawn_contours_own_numbers(chosen, qtbot):
    open_tab(chosen, qtbot, "Growth")
    curve = chosen.desk.picture.curve_now
    row = chosen.desk.picture.measured_of(chosen.session.regions[0]).row
    at = int(np.argmin(np.abs(curve.x - 1.0)))
    assert curve.x[at] == pytest.approx(1.0)
    assert curve.first[at] == pytest.approx(row["circulation"]["value"], rel=1e-9)
    assert "plateau" in chosen.drawer.said.text()


def test_around_gives_back_the_circulation(chosen, qtbot):
    open_tab(chosen, qtbot, "Around")
    curve = chosen.desk.picture.curve_now
    row = chosen.desk.picture.measured_of(chosen.session.regions[0]).row
    total = float(np.trapezoid(curve.first, curve.x))
    assert total == pytest.approx(row["circulation"]["value"], rel=0.02)


def test_profile_belongs_to_lines(chosen, qtbot):
    open_tab(chosen, qtbot, "Profile")
    assert "Choose a line" in chosen.drawer.said.text()
    chosen.desk.add_region(Line(name="cut", points=((0.06, 0.01), (0.06, 0.05))))
    settle(qtbot, chosen)
    curve = chosen.desk.picture.curve_now
    assert curve is not None and curve.region.name == "cut"
    # the last point is the middle of the last piece between grid lines
    assert curve.x[-1] == pytest.approx(0.04, abs=0.0011)


def test_over_time_shows_what_was_followed_and_forgets_what_no_longer_holds(chosen, qtbot):
    open_tab(chosen, qtbot, "Over time")
    assert "Follow" in chosen.drawer.said.text()
    action(chosen, "measure.follow").trigger()
    settle(qtbot, chosen)
    assert "4 of 4 frames" in chosen.drawer.said.text()
    chosen.ledger.lines[1].switch.click()
    settle(qtbot, chosen)
    assert "Follow" in chosen.drawer.said.text()
    action(chosen, "edit.undo").trigger()
    settle(qtbot, chosen)
    assert "4 of 4 frames" in chosen.drawer.said.text()


def test_budget_shows_every_contribution_of_the_row(chosen, qtbot):
    open_tab(chosen, qtbot, "Budget")
    printed = measure(chosen.session, frames=[0])[0]["regions"][0]
    shown = {row[0].value: row[1].value for row in chosen.drawer.budget.model.rows}
    assert shown == {p["part"]: p["uncertainty"] for p in printed["budget"]["circulation"]}
    assert "Γ" in chosen.drawer.budget.number.currentText()


def test_budget_shares_add_up_and_what_is_unknown_is_said():
    parts = [
        {"part": "random", "kind": "random", "sensitivity": None, "uncertainty": 3.0},
        {"part": "scale", "kind": "systematic", "sensitivity": 2.0, "uncertainty": 4.0},
        {"part": "gain", "kind": "systematic", "sensitivity": 1.0, "uncertainty": None},
    ]
    rows = budget_rows(parts, 1.0)
    assert [row[0].value for row in rows] == ["scale", "random", "gain"]
    assert [row[2].value for row in rows] == [pytest.approx(0.64), pytest.approx(0.36), None]
    assert rows[2][1].text == "not stated"


def test_coordinates_are_typed_exactly(chosen, qtbot):
    open_tab(chosen, qtbot, "Shape")
    model = chosen.drawer.shape.model
    assert [p.name for p in model.places] == ["centre", "radius"]
    first = chosen.session
    assert model.setData(model.index(1, 1), "0,0125")
    assert chosen.session.regions[0].radius == 0.0125
    assert model.setData(model.index(0, 2), "0.031")
    assert chosen.session.regions[0].centre == (0.04, 0.031)
    assert not model.setData(model.index(1, 1), "-1")
    assert "radius" in chosen.banner.text.text()
    assert chosen.session.regions[0].radius == 0.0125
    chosen.desk.undo()
    chosen.desk.undo()
    assert chosen.session == first
    settle(qtbot, chosen)


def test_right_drag_zooms_to_a_box(window):
    viewport = window.canvas.viewport()
    start, end = pixel(window, 0.02, 0.02), pixel(window, 0.05, 0.04)
    QTest.mousePress(viewport, Qt.MouseButton.RightButton, pos=start)
    held = QMouseEvent(
        QMouseEvent.Type.MouseMove,
        QPointF(end),
        QPointF(viewport.mapToGlobal(end)),
        Qt.MouseButton.NoButton,
        Qt.MouseButton.RightButton,
        Qt.KeyboardModifier.NoModifier,
    )
    QApplication.sendEvent(viewport, held)
    before = window.canvas.lens().scale
    QTest.mouseRelease(viewport, Qt.MouseButton.RightButton, pos=end)
    (x0, x1), (y0, y1) = window.canvas.view_box.viewRange()
    assert window.canvas.lens().scale > 1.3 * before
    assert x0 < 0.0201 and x1 > 0.0499 and y0 < 0.0201 and y1 > 0.0399
