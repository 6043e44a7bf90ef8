"""Choosing, moving and reshaping regions on the canvas."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest

from tests.gui.conftest import action, click, drag, key, near, pixel, settle


@pytest.fixture
def chosen(window):
    """The window with its circle chosen by a click on the outline."""
    action(window, "tool.move").trigger()
    click(window, 0.055, 0.03)
    assert window.desk.picture.shown.selected == "core"
    return window


def test_dragging_a_handle_changes_the_radius_in_one_step(chosen):
    first = chosen.session
    drag(chosen, (0.04, 0.045), (0.04, 0.05), steps=6)
    assert near(chosen, chosen.session.regions[0].radius, 0.02)
    action(chosen, "edit.undo").trigger()
    assert chosen.session == first


def test_dragging_the_inside_moves_the_region(chosen):
    drag(chosen, (0.045, 0.035), (0.05, 0.03))
    region = chosen.session.regions[0]
    assert near(chosen, region.centre, (0.045, 0.025))
    assert region.radius == 0.015


def test_numbers_and_table_follow_every_move_of_the_drag(chosen):
    def shown_circulation():
        column = chosen.regions.model.titles.index("Γ [m²/s]")
        return chosen.regions.model.rows[0][column].value

    before = shown_circulation()
    drag(chosen, (0.04, 0.045), (0.04, 0.036), release=False)
    during = shown_circulation()
    assert during != before
    assert chosen.session.regions[0].radius == 0.015, "no edit before the button is let go"
    key(chosen, Qt.Key.Key_Escape)
    assert shown_circulation() == before, "Esc puts the region back"
    QTest.mouseRelease(chosen.canvas.viewport(), Qt.MouseButton.LeftButton, pos=pixel(chosen, 0.04, 0.036))
    assert chosen.session.regions[0].radius == 0.015


def test_choosing_is_no_undo_step(chosen):
    assert not action(chosen, "edit.undo").isEnabled()
    click(chosen, 0.005, 0.005)
    assert chosen.desk.picture.shown.selected is None
    assert not action(chosen, "edit.undo").isEnabled()


def test_undo_names_what_it_undoes(chosen):
    drag(chosen, (0.04, 0.045), (0.04, 0.05))
    assert action(chosen, "edit.undo").text() == "Undo reshape core"
    action(chosen, "edit.undo").trigger()
    assert action(chosen, "edit.redo").text() == "Redo reshape core"


def test_delete_duplicate_and_rename(chosen, qtbot):
    action(chosen, "region.duplicate").trigger()
    assert [r.name for r in chosen.session.regions] == ["core", "core 1"]
    key(chosen, Qt.Key.Key_Delete)
    assert [r.name for r in chosen.session.regions] == ["core"]
    index = chosen.regions.model.index(0, 0)
    chosen.regions.view.setCurrentIndex(index)
    chosen.regions.view.edit(index)
    editor = chosen.regions.view.viewport().focusWidget() or chosen.regions.view.indexWidget(index)
    QTest.keyClicks(editor, "upper")
    QTest.keyClick(editor, Qt.Key.Key_Return)
    qtbot.waitUntil(lambda: chosen.session.regions[0].name == "upper")
    assert chosen.desk.picture.shown.selected == "upper"
    settle(qtbot, chosen)
    assert chosen.regions.model.rows[0][0].text == "upper"


def test_a_region_is_given_another_colour(chosen):
    action(chosen, "region.colour.green").trigger()
    assert chosen.session.regions[0].colour == "#009e73"
    assert action(chosen, "edit.undo").text() == "Undo colour core"


def test_a_taken_name_is_refused_in_the_banner(chosen):
    action(chosen, "region.duplicate").trigger()
    chosen.regions.model.setData(chosen.regions.model.index(1, 0), "core")
    assert 'two regions are named "core"' in chosen.banner.text.text()
    assert [r.name for r in chosen.session.regions] == ["core", "core 1"]


def test_handles_of_a_fresh_polygon_can_be_dragged_with_its_tool_in_hand(window):
    action(window, "tool.polygon").trigger()
    corners = [(0.02, 0.015), (0.05, 0.015), (0.05, 0.045)]
    for corner in corners:
        click(window, *corner)
    key(window, Qt.Key.Key_Return)
    drag(window, corners[0], (0.01, 0.01))
    assert near(window, window.session.regions[-1].points, [(0.01, 0.01), *corners[1:]])
    drag(window, (0.03, 0.0125), (0.03, 0.005))
    assert len(window.session.regions[-1].points) == 4, "dragging an edge's middle adds a corner"
