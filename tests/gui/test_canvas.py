"""The canvas: where things lie, how they are thinned, how the view moves."""

import numpy as np
import pytest
from PySide6.QtCore import QPoint, QPointF, Qt
from PySide6.QtGui import QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QGraphicsView

from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid, Placement
from fieldview.gui.canvas.arrows import LEAST_PIXELS, shown_nodes, thinning
from fieldview.gui.canvas.lens import Lens
from fieldview.gui.canvas.map_image import map_image, outline
from fieldview.gui.theme import LIGHT, colour_table
from tests.gui.conftest import action, key, pixel


def plain_field(nx=40, ny=30, spacing=0.01) -> Field:
    grid = Grid(np.arange(nx) * spacing, np.arange(ny) * spacing)
    return Field(grid, u=np.ones(grid.shape), v=np.zeros(grid.shape))


def test_the_canvas_is_the_graphics_view_itself(window):
    assert window.findChild(QGraphicsView, "canvas") is window.canvas


def test_plane_to_pixels_and_back(window):
    for size in ((1280, 720), (1920, 1080)):
        window.resize(*size)
        QApplication.processEvents()
        for z in (0.01 + 0.01j, 0.08 + 0.06j, 0.04 + 0.03j):
            at = window.canvas.to_widget(z.real, z.imag)
            assert window.canvas.to_plane(at) == pytest.approx(z, abs=1e-12)


def test_scales_are_equal_and_y_points_up(window):
    origin, right, up = (window.canvas.to_widget(*p) for p in ((0, 0), (0.01, 0), (0, 0.01)))
    assert right.x() - origin.x() == pytest.approx(origin.y() - up.y(), rel=1e-6)
    assert up.y() < origin.y()


def test_wheel_zooms_about_the_pointer(window):
    at = window.canvas.to_widget(0.05, 0.02)
    before = window.canvas.lens().scale
    wheel = QWheelEvent(
        at,
        QPointF(window.canvas.viewport().mapToGlobal(at)),
        QPoint(),
        QPoint(0, 240),
        Qt.MouseButton.NoButton,
        Qt.KeyboardModifier.NoModifier,
        Qt.ScrollPhase.NoScrollPhase,
        False,
    )
    QApplication.sendEvent(window.canvas.viewport(), wheel)
    assert window.canvas.lens().scale > 1.2 * before
    after = window.canvas.to_widget(0.05, 0.02)
    assert (after - at).manhattanLength() < 1e-6
    key(window, Qt.Key.Key_F)
    assert window.canvas.lens().scale == pytest.approx(before)


@pytest.mark.parametrize("button", ["middle", "space"])
def test_dragging_pans_by_as_many_pixels(window, button):
    from tests.gui.conftest import move

    before = window.canvas.to_widget(0.04, 0.03)
    viewport, start = window.canvas.viewport(), pixel(window, 0.04, 0.03)
    which = Qt.MouseButton.MiddleButton if button == "middle" else Qt.MouseButton.LeftButton
    if button == "space":
        QTest.keyPress(window.canvas, Qt.Key.Key_Space)
    QTest.mousePress(viewport, which, pos=start)
    end = window.canvas.to_plane(QPointF(start + QPoint(60, -25)))
    move(window, end.real, end.imag)
    QTest.mouseRelease(viewport, which, pos=start + QPoint(60, -25))
    if button == "space":
        QTest.keyRelease(window.canvas, Qt.Key.Key_Space)
    after = window.canvas.to_widget(0.04, 0.03)
    assert (after - before - QPointF(60, -25)).manhattanLength() < 1.01
    assert not window.time_strip.playing, "Space used for panning does not play"


def test_double_click_on_empty_canvas_fits(window):
    fitted = window.canvas.lens()
    window.canvas.zoom(3.0)
    QTest.mouseDClick(window.canvas.viewport(), Qt.MouseButton.LeftButton, pos=pixel(window, 0.06, 0.01))
    assert window.canvas.lens().scale == pytest.approx(fitted.scale)


@pytest.mark.parametrize("scale", [150.0, 700.0, 1250.0, 9000.0])
def test_arrows_never_stand_closer_than_twelve_pixels(scale):
    field = plain_field()
    lens = Lens(scale, 0.0, 500.0, 800.0, 600.0)
    thin = thinning(field, lens)
    pixels = 0.01 * scale
    assert thin.x * pixels >= LEAST_PIXELS - 1e-6
    assert thin.x == 1 or (thin.x - 1) * pixels < LEAST_PIXELS, "no coarser than needed"
    assert ("every vector" in thin.sentence) == (thin.x == 1)


def test_every_shown_arrow_is_on_the_thinned_lattice_wherever_the_view_is():
    field = plain_field(400, 300)
    lens = Lens(300.0, -500.0, 700.0, 400.0, 300.0)
    rows, columns = shown_nodes(field, lens)
    whole_rows, whole_columns = shown_nodes(field, Lens(300.0, 0.0, 900.0, 1e6, 1e6))
    everywhere = set(np.arange(400)[whole_columns])
    assert set(np.arange(400)[columns]) <= everywhere
    assert set(np.arange(300)[rows]) <= set(np.arange(300)[whole_rows])
    visible = [i for i in everywhere if 0 <= -500 + 300 * field.grid.x[i] <= 400]
    assert set(visible) <= set(np.arange(400)[columns])


def test_the_map_shows_each_value_at_its_node_also_on_uneven_turned_axes():
    x = np.array([0.0, 1.0, 3.0, 7.0])
    y = np.array([0.0, 2.0, 3.0])
    placement = Placement().then(turn=0.3, about=1 + 1j, reflect="x", shift=2 - 1j)
    grid = Grid(x, y, placement)
    values = np.arange(12.0).reshape(3, 4)
    values[1, 2] = np.nan
    shown = map_image(values, grid, colour_table(LIGHT, "unsigned"), 0.0, 11.0)
    table = colour_table(LIGHT, "unsigned")
    for iy in range(3):
        for ix in range(4):
            place = shown.placement.map(QPointF(x[ix], y[iy]))
            assert complex(place.x(), place.y()) == pytest.approx(complex(grid.nodes[iy, ix]))
            column = int((x[ix] - shown.rect.left()) / shown.rect.width() * shown.image.width())
            row = int((y[iy] - shown.rect.top()) / shown.rect.height() * shown.image.height())
            colour = shown.image.pixelColor(column, row)
            if np.isnan(values[iy, ix]):
                assert colour.alpha() == 0
            else:
                expected = table[int(values[iy, ix] / 11 * 255 + 0.5)]
                assert [colour.red(), colour.green(), colour.blue()] == list(expected)


def test_the_outline_reaches_half_a_spacing_beyond_the_nodes():
    field = plain_field(3, 2, spacing=0.1)
    corners = outline(field.grid)
    assert np.ptp(corners.real) == pytest.approx(0.3)
    assert np.ptp(corners.imag) == pytest.approx(0.2)


def test_a_single_row_of_nodes_can_be_drawn(open_window, tmp_path):
    rows = ["x [m],y [m],u [m/s],v [m/s]"] + [f"{0.01 * i},0,{0.1 + 0.01 * i},0" for i in range(12)]
    path = tmp_path / "profile.csv"
    path.write_text("\n".join(rows))
    window = open_window(path)
    assert window.desk.picture.field is not None, window.banner.text.text()
    assert not window.grab().isNull()


def test_legend_names_the_marks_that_occur(window, qtbot):
    from fieldview.gui import ledger_edits
    from tests.gui.conftest import settle

    marks = dict(window.canvas.legend._key.marks)
    assert set(marks) == {"measured", "filled"}
    ledger_edits.as_of(window.desk, 0)
    settle(qtbot, window)
    assert set(dict(window.canvas.legend._key.marks)) == {"measured", "rejected", "missing"}
    assert window.desk.picture.field.count(Status.FILLED) == 0


def test_colour_range_and_arrow_length_are_locked_across_frames(window, qtbot):
    from tests.gui.conftest import settle

    levels, speed = window.desk.picture.shown.levels["vorticity"], window.desk.picture.shown.speed
    assert levels[0] == -levels[1], "symmetric for a signed quantity"
    key(window, Qt.Key.Key_Right)
    settle(qtbot, window)
    assert window.desk.picture.field_frame == 1
    assert window.desk.picture.shown.levels["vorticity"] == levels
    assert window.desk.picture.shown.speed == speed
    action(window, "map.speed").trigger()
    settle(qtbot, window)
    assert window.desk.picture.map.name == "speed"
    assert window.desk.picture.shown.levels["speed"][0] == 0
