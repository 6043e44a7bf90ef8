"""Vectors rejected, kept and masked with the mouse."""

from PySide6.QtCore import Qt
from PySide6.QtTest import QTest

from fieldview.compute.field import Status
from fieldview.session.steps import Fill, HandEdit, Mask, MedianTest
from tests.gui.conftest import SPACING, action, click, drag, key, settle


def place(iy, ix):
    return ix * SPACING, iy * SPACING


def test_a_click_rejects_one_vector_before_filling(window, qtbot):
    action(window, "tool.reject").trigger()
    window.canvas.zoom(2.0, complex(*place(15, 20)))
    click(window, *place(15, 20))
    assert [type(s) for s in window.session.ledger] == [MedianTest, HandEdit, Fill]
    assert window.session.ledger[1].reject == ((0, 15, 20),)
    settle(qtbot, window)
    assert window.desk.picture.field.status[15, 20] == Status.FILLED
    assert action(window, "edit.undo").text() == "Undo reject 1 vector"


def test_a_sweep_of_the_brush_is_one_step(window, qtbot):
    first = window.session
    action(window, "tool.reject").trigger()
    drag(window, place(10, 10), place(10, 16), steps=12)
    rejected = window.session.ledger[1].reject
    assert {(0, 10, ix) for ix in range(10, 17)} <= set(rejected)
    action(window, "edit.undo").trigger()
    assert window.session == first
    settle(qtbot, window)


def test_a_rejected_vector_is_taken_back(window, qtbot):
    assert window.desk.picture.field.status[5, 7] == Status.FILLED
    action(window, "tool.keep").trigger()
    window.canvas.zoom(2.0, complex(*place(5, 7)))
    click(window, *place(5, 7))
    settle(qtbot, window)
    assert window.session.ledger[1].keep == ((0, 5, 7),)
    assert window.desk.picture.field.status[5, 7] == Status.MEASURED
    assert window.desk.picture.field.u[5, 7] > 1.5, "the measured value itself comes back"


def test_rejecting_what_was_kept_moves_it_to_the_other_list(window, qtbot):
    from fieldview.gui import ledger_edits

    ledger_edits.by_hand(window.desk, keep=((0, 5, 7), (0, 6, 7)))
    ledger_edits.by_hand(window.desk, reject=((0, 5, 7),))
    step = window.session.ledger[1]
    assert (step.keep, step.reject) == (((0, 6, 7),), ((0, 5, 7),))


def test_a_mask_is_drawn_as_a_polygon(window, qtbot):
    action(window, "tool.mask").trigger()
    corners = [place(-1, -1), place(-1, 10.5), place(10.5, 10.5), place(10.5, -1)]
    window.canvas.zoom(0.8)
    for corner in corners:
        click(window, *corner)
    key(window, Qt.Key.Key_Return)
    assert [type(s) for s in window.session.ledger] == [Mask, MedianTest, Fill]
    settle(qtbot, window)
    field = window.desk.picture.field
    assert (field.status[:11, :11] == Status.MASKED).all()
    assert field.count(Status.MASKED) == 11 * 11
    assert dict(window.canvas.legend._key.marks).get("masked")
    assert not window.grab().isNull()
    action(window, "edit.undo").trigger()
    assert [type(s) for s in window.session.ledger] == [MedianTest, Fill]


def test_escape_leaves_a_sweep_without_effect(window):
    from tests.gui.conftest import pixel

    first = window.session
    action(window, "tool.reject").trigger()
    drag(window, place(10, 10), place(10, 14), release=False)
    key(window, Qt.Key.Key_Escape)
    QTest.mouseRelease(window.canvas.viewport(), Qt.MouseButton.LeftButton, pos=pixel(window, *place(10, 14)))
    assert window.session == first
