"""Every drawing tool, by real mouse and key events."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest

from tests.gui.conftest import action, click, drag, key, move, near, pixel, settle

SQUARE = [(0.02, 0.015), (0.05, 0.015), (0.05, 0.045), (0.02, 0.045)]


def test_polygon_is_drawn_with_clicks_and_closed_with_return(window, qtbot):
    first = window.session
    action(window, "tool.polygon").trigger()
    for corner in SQUARE:
        click(window, *corner)
    assert window.session == first, "nothing is an edit before the polygon is closed"
    key(window, Qt.Key.Key_Return)
    drawn = window.session.regions[-1]
    assert drawn.shape == "polygon"
    assert near(window, drawn.points, SQUARE)
    action(window, "edit.undo").trigger()
    assert window.session == first, "one drawn region is one undo step"
    action(window, "edit.redo").trigger()
    assert window.session.regions[-1] == drawn


def test_double_click_closes_a_polygon(window):
    key(window, Qt.Key.Key_G)
    for corner in SQUARE[:3]:
        click(window, *corner)
    at = pixel(window, *SQUARE[3])
    QTest.mouseClick(window.canvas.viewport(), Qt.MouseButton.LeftButton, pos=at)
    QTest.mouseDClick(window.canvas.viewport(), Qt.MouseButton.LeftButton, pos=at)
    assert near(window, window.session.regions[-1].points, SQUARE)


def test_backspace_takes_back_a_corner_and_escape_drops_the_drawing(window):
    first = window.session
    action(window, "tool.polygon").trigger()
    for corner in [*SQUARE[:3], (0.03, 0.02)]:
        click(window, *corner)
    key(window, Qt.Key.Key_Backspace)
    key(window, Qt.Key.Key_Return)
    assert near(window, window.session.regions[-1].points, SQUARE[:3])
    action(window, "edit.undo").trigger()
    for corner in SQUARE[:3]:
        click(window, *corner)
    key(window, Qt.Key.Key_Escape)
    key(window, Qt.Key.Key_Return)
    assert window.session == first
    assert window.desk.picture.draft is None


def test_too_few_corners_are_explained_not_drawn(window):
    first = window.session
    action(window, "tool.polygon").trigger()
    click(window, *SQUARE[0])
    click(window, *SQUARE[1])
    key(window, Qt.Key.Key_Return)
    assert window.session == first
    assert "at least 3" in window.banner.text.text()
    click(window, *SQUARE[2])
    key(window, Qt.Key.Key_Return)
    assert len(window.session.regions) == 2, "the drawing could be finished all the same"


def test_self_crossing_polygon_is_refused_with_the_remedy(window):
    first = window.session
    action(window, "tool.polygon").trigger()
    for corner in (SQUARE[0], SQUARE[2], SQUARE[1], (0.02, 0.035)):
        click(window, *corner)
    key(window, Qt.Key.Key_Return)
    assert window.session == first
    assert "crosses itself" in window.banner.text.text()


@pytest.mark.parametrize(
    ("tool", "start", "end", "check"),
    [
        ("rectangle", (0.02, 0.01), (0.05, 0.04), lambda r: [*r.corners[0], *r.corners[1]]),
        ("circle", (0.04, 0.03), (0.04, 0.045), lambda r: [*r.centre, r.radius]),
        ("ellipse", (0.04, 0.03), (0.06, 0.04), lambda r: [*r.centre, *r.semi_axes]),
    ],
)
def test_shapes_are_dragged(window, tool, start, end, check):
    expected = {
        "rectangle": [0.02, 0.01, 0.05, 0.04],
        "circle": [0.04, 0.03, 0.015],
        "ellipse": [0.04, 0.03, 0.02, 0.01],
    }[tool]
    action(window, f"tool.{tool}").trigger()
    drag(window, start, end)
    drawn = window.session.regions[-1]
    assert drawn.shape == tool
    assert near(window, check(drawn), expected)
    action(window, "edit.undo").trigger()
    assert len(window.session.regions) == 1


def test_shapes_can_be_drawn_with_two_clicks(window):
    action(window, "tool.circle").trigger()
    click(window, 0.05, 0.03)
    move(window, 0.05, 0.04, held=False)
    click(window, 0.05, 0.042)
    drawn = window.session.regions[-1]
    assert near(window, [*drawn.centre, drawn.radius], [0.05, 0.03, 0.012])


def test_shift_keeps_square_and_straight(window):
    shift = Qt.KeyboardModifier.ShiftModifier
    action(window, "tool.rectangle").trigger()
    drag(window, (0.02, 0.01), (0.05, 0.02), modifiers=shift)
    (x0, y0), (x1, y1) = window.session.regions[-1].corners
    assert x1 - x0 == pytest.approx(y1 - y0, rel=1e-9)
    action(window, "tool.line").trigger()
    click(window, 0.01, 0.01)
    click(window, 0.05, 0.0125, modifiers=shift)
    key(window, Qt.Key.Key_Return)
    start, end = window.session.regions[-1].points
    assert end[1] == pytest.approx(start[1], abs=1e-12)


def test_line_keeps_its_direction(window):
    action(window, "tool.line").trigger()
    for place in ((0.06, 0.01), (0.06, 0.05)):
        click(window, *place)
    key(window, Qt.Key.Key_Return)
    line = window.session.regions[-1]
    assert line.shape == "line"
    assert near(window, line.points, [(0.06, 0.01), (0.06, 0.05)])


def test_freehand_stroke_becomes_a_polygon_with_the_corners_it_needs(window):
    from math import cos, pi, sin

    action(window, "tool.freehand").trigger()
    ring = [(0.04 + 0.012 * cos(t * pi / 30), 0.03 + 0.012 * sin(t * pi / 30)) for t in range(59)]
    viewport = window.canvas.viewport()
    QTest.mousePress(viewport, Qt.MouseButton.LeftButton, pos=pixel(window, *ring[0]))
    for place in ring[1:]:
        move(window, *place)
    QTest.mouseRelease(viewport, Qt.MouseButton.LeftButton, pos=pixel(window, *ring[-1]))
    drawn = window.session.regions[-1]
    assert drawn.shape == "polygon"
    assert 8 <= len(drawn.points) < 59
    assert drawn.outline().area == pytest.approx(pi * 0.012**2, rel=0.05)


def test_numbers_follow_a_drawing_before_it_is_finished(window, qtbot):
    action(window, "tool.circle").trigger()
    drag(window, (0.04, 0.03), (0.04, 0.045), release=False)
    live = window.desk.picture.draft_measured
    assert live is not None
    assert live.row["circulation"]["value"] == pytest.approx(0.01, rel=0.1)
    QTest.mouseRelease(window.canvas.viewport(), Qt.MouseButton.LeftButton, pos=pixel(window, 0.04, 0.045))
    settle(qtbot, window)
    final = window.desk.picture.measured_of(window.session.regions[-1])
    assert final.whole
    # only the part from gaps takes longer than a drag allows
    for part in ("random", "systematic"):
        now, then = (m.row["circulation"]["uncertainty"][part] for m in (live, final))
        assert now == then
    assert final.row["circulation"]["value"] == live.row["circulation"]["value"]


def test_new_regions_get_free_names_and_unused_colours(window):
    for centre in (0.03, 0.05):
        action(window, "tool.circle").trigger()
        drag(window, (centre, 0.03), (centre, 0.035))
    drawn = window.session.regions[-2:]
    assert [r.name for r in drawn] == ["circle 1", "circle 2"]
    assert drawn[0].colour != drawn[1].colour
