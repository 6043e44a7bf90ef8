"""The canvas itself: axes, layers, and the pointer handed to the tool in use."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import QPointF, QRectF, Qt, Signal
from PySide6.QtGui import QColor

from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.gui import theme as themes
from fieldview.gui.canvas.furniture import ColourBar, Legend
from fieldview.gui.canvas.layers import FlowLayer, LinesLayer, MapLayer, Sketch, SketchLayer, StreamLayer
from fieldview.gui.canvas.lens import Lens
from fieldview.gui.canvas.map_image import outline
from fieldview.gui.canvas.region_layer import RegionLayer
from fieldview.gui.theme import LIGHT, Theme

NEAR = 7.0
"""How near the pointer must come to a handle or a line. [px]"""


@dataclass(frozen=True)
class Pointer:
    """Where the pointer is: in the plane and on the viewport, with the scale there [px per length]."""

    at: complex
    pixel: complex
    scale: float
    shift: bool = False
    control: bool = False

    @property
    def reach(self) -> float:
        """The distance in the plane that counts as touching. [length]"""
        return NEAR / self.scale


class Canvas(pg.GraphicsView):
    """The field and the regions over it. Wheel zooms at the cursor, right drag zooms to a box, middle drag or
    Space drag pans."""

    play_tapped = Signal()
    range_moved = Signal()

    _fitted = False  # asked for while the base class is still being made

    def __init__(self, parent=None):
        super().__init__(parent)
        self.setObjectName("canvas")
        self.setAccessibleName("Canvas")
        self.setAccessibleDescription("The velocity field with its regions; tools act here")
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setMinimumSize(240, 180)
        self.setAcceptDrops(False)  # the window takes what is dropped
        self.tool = None
        self._theme: Theme = LIGHT
        self._fitted = True
        self._pan_from: QPointF | None = None
        self._box_from: complex | None = None
        self._space_down = self._space_used = False
        self._extent: QRectF | None = None
        self._grid: Grid | None = None
        self.corners = np.zeros(0, complex)  # places of regions that are snapped to as well
        self._build()

    def _build(self):
        self.plot = pg.PlotItem(enableMenu=False)
        # the plot's own menu is never shown, yet made: as a child it goes when the canvas goes
        self.plot.ctrlMenu.setParent(self, self.plot.ctrlMenu.windowFlags())
        self.plot.hideButtons()
        self.setCentralItem(self.plot)
        self.view_box = self.plot.getViewBox()
        self.view_box.setMouseEnabled(False, False)
        self.view_box.setAspectLocked(True)
        self.view_box.disableAutoRange()
        self.view_box.setDefaultPadding(0)
        self.plot.layout.setContentsMargins(10, 8, 0, 4)
        for name in ("left", "bottom"):
            axis = self.plot.getAxis(name)
            axis.enableAutoSIPrefix(False)
            axis.setStyle(tickLength=-4, maxTickLevel=0, tickTextOffset=6)
        self.colour_bar, self.legend = ColourBar(), Legend()
        self.plot.layout.addItem(self.colour_bar, 2, 3)
        self.plot.layout.addItem(self.legend, 4, 0, 1, 4)
        layers = (MapLayer, LinesLayer, FlowLayer, StreamLayer, RegionLayer, SketchLayer)
        self._layers = [layer(self.view_box, self.lens) for layer in layers]
        self.map_layer, self.lines_layer, self.flow_layer, *above = self._layers
        self.stream_layer, self.region_layer, self.sketch_layer = above
        self.view_box.sigRangeChanged.connect(self._range_changed)
        self.view_box.sigResized.connect(self._range_changed)

    # -- the view ------------------------------------------------------------------------------------

    def lens(self) -> Lens:
        """How the plane lies on the view box now."""
        box = self.view_box
        (x0, x1), (_, y1) = box.viewRange()
        width, height = box.width(), box.height()
        scale = width / (x1 - x0) if x1 > x0 and width > 0 else 1.0
        return Lens(scale, -x0 * scale, y1 * scale, width, height)

    def to_widget(self, x: float, y: float) -> QPointF:
        """Plane coordinates to pixels of the viewport."""
        self._settle()
        scene = self.view_box.mapToScene(self.lens().point(complex(x, y)))
        return self.viewportTransform().map(scene)

    def to_plane(self, position: QPointF) -> complex:
        """Pixels of the viewport to the plane."""
        back, _ = self.viewportTransform().inverted()
        local = self.view_box.mapFromScene(back.map(QPointF(position)))
        return complex(self.lens().to_plane(complex(local.x(), local.y())))

    def _settle(self):
        # a layout that has not been activated since the last resize would give last moment's pixels
        self.plot.layout.activate()

    def set_extent(self, field: Field | None) -> None:
        """What F fits: the field's grid with half a spacing around it; its nodes are snapped to."""
        self._grid = field.grid if field is not None else None
        if field is None:
            self._extent = None
            return
        corners = outline(field.grid)
        extent = QRectF(
            QPointF(corners.real.min(), corners.imag.min()), QPointF(corners.real.max(), corners.imag.max())
        )
        if extent != self._extent:
            self._extent = extent
            self.fit()

    def fit(self) -> None:
        """Show the whole field."""
        self._fitted = True
        if self._extent is not None:
            self._settle()
            margin = 0.03 * max(self._extent.width(), self._extent.height())
            self.view_box.setRange(self._extent.adjusted(-margin, -margin, margin, margin), padding=0)

    def fit_rect(self, low: complex, high: complex) -> None:
        """Show the rectangle of the plane with these opposite corners."""
        self._fitted = False
        self.view_box.setRange(
            QRectF(QPointF(low.real, low.imag), QPointF(high.real, high.imag)).normalized(), padding=0.02
        )

    def zoom(self, factor: float, about: complex | None = None) -> None:
        """Magnify about a point of the plane (the middle of the view if left out)."""
        self._fitted = False
        centre = None if about is None else QPointF(about.real, about.imag)
        self.view_box.scaleBy((1 / factor, 1 / factor), center=centre)

    def pan(self, pixels: QPointF) -> None:
        """Shift the view by so many pixels."""
        self._fitted = False
        scale = self.lens().scale
        self.view_box.translateBy(x=-pixels.x() / scale, y=pixels.y() / scale)

    def _range_changed(self, *_):
        for layer in self._layers:
            layer.prepareGeometryChange()
            layer.update()
        self.range_moved.emit()

    # -- looks ---------------------------------------------------------------------------------------

    def set_theme(self, theme: Theme) -> None:
        self._theme = theme
        self.setBackground(QColor(theme.canvas))
        for name in ("left", "bottom"):
            axis = self.plot.getAxis(name)
            axis.setPen(QColor(theme.muted))
            axis.setTextPen(QColor(theme.muted))
            axis.setStyle(tickFont=themes.font(pixels=themes.SMALL_PIXELS))
            axis.setHeight(40) if name == "bottom" else axis.setWidth(54)
            axis.label.setFont(themes.font(pixels=themes.SMALL_PIXELS))

    def set_axis_labels(self, x: str, y: str, scale: float = 1.0) -> None:
        for name, text in (("bottom", x), ("left", y)):
            axis = self.plot.getAxis(name)
            axis.setLabel(text=text, **{"color": self._theme.muted, "font-size": f"{themes.SMALL_PIXELS}px"})
            axis.setScale(scale)

    def show_sketch(self, sketch: Sketch | None) -> None:
        self.sketch_layer.show(sketch, self._theme)

    # -- pointer and keys ----------------------------------------------------------------------------

    def pointer(self, event) -> Pointer:
        position, modifiers = event.position(), event.modifiers()
        at, scale = self.to_plane(position), self.lens().scale
        snaps = bool(modifiers & Qt.KeyboardModifier.ControlModifier)
        if snaps and self._grid is not None:
            at = snapped(at, self._grid, self.corners, NEAR / scale)
        shift = bool(modifiers & Qt.KeyboardModifier.ShiftModifier)
        return Pointer(at, complex(position.x(), position.y()), scale, shift, snaps)

    def mousePressEvent(self, event):
        event.accept()
        if event.button() == Qt.MouseButton.MiddleButton or (
            event.button() == Qt.MouseButton.LeftButton and self._space_down
        ):
            self._pan_from, self._space_used = event.position(), True
            self.viewport().setCursor(Qt.CursorShape.ClosedHandCursor)
        elif event.button() == Qt.MouseButton.RightButton:
            self._box_from = self.to_plane(event.position())
        elif self.tool is not None and event.button() == Qt.MouseButton.LeftButton:
            self.tool.press(self.pointer(event))
            self._after_tool()

    def mouseMoveEvent(self, event):
        event.accept()
        if self._pan_from is not None:
            self.pan(event.position() - self._pan_from)
            self._pan_from = event.position()
        elif self._box_from is not None:
            self.show_sketch(Sketch(_corners(self._box_from, self.to_plane(event.position())), True, False))
        elif self.tool is not None:
            pointer = self.pointer(event)
            if event.buttons() & Qt.MouseButton.LeftButton:
                self.tool.drag(pointer)
            else:
                self.tool.hover(pointer)
            self._after_tool(pointer)

    def mouseReleaseEvent(self, event):
        event.accept()
        if self._pan_from is not None:
            self._pan_from = None
            self._after_tool(self.pointer(event))
        elif self._box_from is not None and event.button() == Qt.MouseButton.RightButton:
            start, end = self._box_from, self.to_plane(event.position())
            self._box_from = None
            self.show_sketch(None)
            if min(abs((end - start).real), abs((end - start).imag)) * self.lens().scale > 2 * NEAR:
                self.fit_rect(start, end)
        elif self.tool is not None and event.button() == Qt.MouseButton.LeftButton:
            self.tool.release(self.pointer(event))
            self._after_tool()

    def mouseDoubleClickEvent(self, event):
        event.accept()
        if event.button() != Qt.MouseButton.LeftButton:
            return
        if self.tool is None or not self.tool.double(self.pointer(event)):
            self.fit()
        self._after_tool()

    def wheelEvent(self, event):
        event.accept()
        turn = event.angleDelta().y() or event.angleDelta().x()
        if turn:
            self.zoom(1.0015**turn, self.to_plane(event.position()))

    def leaveEvent(self, event):
        if self.tool is not None:
            self.tool.left()
        super().leaveEvent(event)

    def keyPressEvent(self, event):
        if event.key() == Qt.Key.Key_Space:
            if not event.isAutoRepeat():
                self._space_down, self._space_used = True, False
                self.viewport().setCursor(Qt.CursorShape.OpenHandCursor)
            event.accept()
        elif self.tool is not None and self.tool.key(event.key(), event.modifiers()):
            event.accept()
            self._after_tool()
        else:
            event.ignore()

    def keyReleaseEvent(self, event):
        if event.key() == Qt.Key.Key_Space and not event.isAutoRepeat():
            self._space_down = False
            self._after_tool()
            if not self._space_used:
                self.play_tapped.emit()
            event.accept()
        else:
            event.ignore()

    def _after_tool(self, pointer: Pointer | None = None):
        if self.tool is None:
            return
        self.show_sketch(self.tool.sketch)
        if not self._space_down and self._pan_from is None:
            self.viewport().setCursor(self.tool.cursor(pointer))

    def resizeEvent(self, event):
        super().resizeEvent(event)
        if self._fitted:
            self.fit()


def _corners(one: complex, other: complex) -> tuple[complex, ...]:
    return (one, complex(other.real, one.imag), other, complex(one.real, other.imag))


def snapped(at: complex, grid: Grid, corners: np.ndarray, reach: float) -> complex:
    """The corner of a region within reach of a place, else the node nearest to it."""
    if corners.size:
        nearest = corners[np.argmin(np.abs(corners - at))]
        if abs(nearest - at) <= reach:
            return complex(nearest)
    local = complex(grid.placement.to_lattice(at))
    x = grid.x[np.argmin(np.abs(grid.x - local.real))]
    y = grid.y[np.argmin(np.abs(grid.y - local.imag))]
    return complex(grid.placement.to_plane(complex(x, y)))


def level_indices(values: np.ndarray, low: float, high: float) -> np.ndarray:
    """Which of 256 colours each value takes: uint8 ndarray of the same shape; no value takes the middle."""
    span = high - low if high > low else 1.0
    scaled = (values - low) * (255.0 / span)
    return np.clip(np.where(np.isfinite(scaled), scaled, 127.5), 0, 255).astype(np.uint8)
