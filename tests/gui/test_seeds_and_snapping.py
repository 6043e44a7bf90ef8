"""Streamlines through seeds, and places that snap to nodes and corners."""

import numpy as np
from PySide6.QtCore import Qt

from fieldview.compute.streamlines import streamlines
from tests.gui.conftest import SPACING, action, click, drag, key, settle

CTRL = Qt.KeyboardModifier.ControlModifier


def test_a_click_draws_the_streamline_through_it_and_another_takes_it_away(window, qtbot):
    first = window.session
    action(window, "tool.seed").trigger()
    click(window, 0.05, 0.03)
    click(window, 0.02, 0.01)
    settle(qtbot, window)
    picture = window.desk.picture
    assert len(picture.shown.seeds) == 2
    for seed, line in zip(picture.shown.seeds, picture.streams_now.lines, strict=True):
        (expected,) = streamlines(picture.field, [seed])
        assert np.array_equal(line, expected) and line.size > 10
    click(window, 0.05, 0.03)
    assert len(window.desk.picture.shown.seeds) == 1
    key(window, Qt.Key.Key_Backspace)
    assert window.desk.picture.shown.seeds == ()
    assert window.session == first, "streamlines belong to the view"
    assert not action(window, "edit.undo").isEnabled()
    settle(qtbot, window)


def test_streamlines_follow_the_frame_and_are_kept_with_the_view(window, qtbot, tmp_path):
    window.desk.show(seeds=(0.05 + 0.03j,))
    settle(qtbot, window)
    before = window.desk.picture.streams_now.lines[0]
    window.desk.go_to(2)
    settle(qtbot, window)
    assert not np.array_equal(before, window.desk.picture.streams_now.lines[0])
    window.desk.save(tmp_path / "kept.session.json")
    settle(qtbot, window)
    window.open([tmp_path / "kept.session.json"])
    settle(qtbot, window)
    assert window.desk.picture.shown.seeds == (0.05 + 0.03j,)
    action(window, "view.clear_seeds").trigger()
    assert window.desk.picture.shown.seeds == ()


def test_control_snaps_corners_to_nodes(window, qtbot):
    action(window, "tool.rectangle").trigger()
    drag(window, (0.0207, 0.0093), (0.0512, 0.0386), modifiers=CTRL)
    (x0, y0), (x1, y1) = window.session.regions[-1].corners
    for value in (x0, y0, x1, y1):
        assert abs(value / SPACING - round(value / SPACING)) < 1e-9
    settle(qtbot, window)


def test_control_snaps_to_the_corner_of_another_region(window, qtbot):
    action(window, "tool.polygon").trigger()
    corners = [(0.0213, 0.0157), (0.0511, 0.0149), (0.0507, 0.0451)]
    for corner in corners:
        click(window, *corner)
    key(window, Qt.Key.Key_Return)
    drawn = window.session.regions[-1].points
    window.desk.show(selected=None)
    action(window, "tool.line").trigger()
    click(window, corners[0][0] + 0.0001, corners[0][1], modifiers=CTRL)
    click(window, 0.07, 0.05)
    key(window, Qt.Key.Key_Return)
    assert window.session.regions[-1].points[0] == drawn[0]
    settle(qtbot, window)
