"""What lies on the axes, from the map up to the regions. Every layer fills the view box, in its pixels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QPainter, QPainterPath, QPen, QPixmap
from PySide6.QtWidgets import QGraphicsObject

from fieldview.compute.field import Field
from fieldview.gui.canvas.arrows import ArrowPainter, ArrowScale, Tint
from fieldview.gui.canvas.lens import Lens
from fieldview.gui.canvas.map_image import MapImage, outline
from fieldview.gui.canvas.marks import MarkPainter, polygon
from fieldview.gui.theme import Theme


class Layer(QGraphicsObject):
    """Base of the layers; ``lens`` is asked of the canvas at every repaint."""

    def __init__(self, view_box, lens_now, z: float):
        super().__init__(view_box)
        self._view_box, self.lens_now = view_box, lens_now
        self.setZValue(z)
        self.setAcceptedMouseButtons(Qt.MouseButton.NoButton)

    def boundingRect(self) -> QRectF:
        return QRectF(self._view_box.rect())

    def viewRangeChanged(self):
        self.update()


class MapLayer(Layer):
    """The colour map, on the lattice it was measured on, and the outline of the grid."""

    def __init__(self, view_box, lens_now):
        super().__init__(view_box, lens_now, -30)
        self._map: MapImage | None = None
        self._outline: np.ndarray | None = None
        self._colour = QColor()

    def show(self, shown: MapImage | None, field: Field | None, theme: Theme) -> None:
        self._map, self._colour = shown, QColor(theme.muted)
        self._outline = outline(field.grid) if field is not None else None
        self.update()

    def paint(self, painter, option, widget=None):
        lens = self.lens_now()
        if self._map is not None:
            painter.save()
            painter.setTransform(self._map.placement * lens.transform(), combine=True)
            painter.drawImage(self._map.rect, self._map.image)
            painter.restore()
        if self._outline is not None:
            painter.setPen(QPen(self._colour, 0.8))
            painter.drawPolygon(polygon(lens.to_pixels(self._outline)))


class LinesLayer(Layer):
    """Iso-lines: given as complex arrays of plane points, with their levels."""

    def __init__(self, view_box, lens_now):
        super().__init__(view_box, lens_now, -20)
        self._lines: tuple[tuple[float, tuple[np.ndarray, ...]], ...] = ()
        self._theme: Theme | None = None

    def show(self, lines, theme: Theme) -> None:
        self._lines, self._theme = lines, theme
        self.update()

    def paint(self, painter, option, widget=None):
        if not self._lines:
            return
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        lens = self.lens_now()
        for level, pieces in self._lines:
            pen = QPen(QColor(self._theme.ink), 1.0)
            pen.setStyle(Qt.PenStyle.DashLine if level < 0 else Qt.PenStyle.SolidLine)
            painter.setPen(pen)
            for piece in pieces:
                painter.drawPolyline(polygon(lens.to_pixels(piece)))


class StreamLayer(Layer):
    """Streamlines with a head half way along, and their seeds."""

    def __init__(self, view_box, lens_now):
        super().__init__(view_box, lens_now, -5)
        self._seeds: tuple[complex, ...] = ()
        self._lines: tuple[np.ndarray, ...] = ()
        self._theme: Theme | None = None

    def show(self, seeds, lines, theme: Theme) -> None:
        self._seeds, self._lines, self._theme = seeds, lines, theme
        self.update()

    def paint(self, painter, option, widget=None):
        if not self._seeds:
            return
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        lens = self.lens_now()
        halo = QColor(self._theme.canvas)
        halo.setAlphaF(0.6)
        for line in self._lines:
            if line.size > 1:
                at = lens.to_pixels(line)
                path = QPainterPath()
                path.addPolygon(polygon(at))
                painter.setBrush(Qt.BrushStyle.NoBrush)
                painter.strokePath(path, QPen(halo, 4.0))
                painter.strokePath(path, QPen(QColor(self._theme.accent), 1.8))
                self._head(painter, at)
        painter.setPen(QPen(QColor(self._theme.canvas), 1.0))
        painter.setBrush(QColor(self._theme.accent))
        for z in lens.to_pixels(np.array(self._seeds)):
            painter.drawEllipse(QPointF(z.real, z.imag), 3.2, 3.2)

    def _head(self, painter, at: np.ndarray) -> None:
        middle = at.size // 2
        along = at[middle] - at[middle - 1]
        if along == 0:
            return
        along = along / abs(along)
        painter.setPen(QPen(QColor(self._theme.accent), 1.8))
        for side in (1 + 0.6j, 1 - 0.6j):
            barb = at[middle] - 8 * along * side
            painter.drawLine(QPointF(at[middle].real, at[middle].imag), QPointF(barb.real, barb.imag))


@dataclass(frozen=True, eq=False)
class Flow:
    """The vectors as they are to be drawn."""

    field: Field
    theme: Theme
    scale: ArrowScale
    tint: Tint | None = None
    rejected: bool = False


class FlowLayer(Layer):
    """Arrows, node marks and masks. Drawn once on a sheet wider than the view, which panning only shifts."""

    MARGIN = 0.25

    def __init__(self, view_box, lens_now):
        super().__init__(view_box, lens_now, -10)
        self.flow: Flow | None = None
        self.painted: Flow | None = None
        self._sheet: QPixmap | None = None
        self._drawn_for: Lens | None = None
        self._arrows, self._marks = ArrowPainter(), MarkPainter()

    def show(self, flow: Flow | None) -> None:
        self.flow, self._sheet = flow, None
        self.update()

    def paint(self, painter, option, widget=None):
        if self.flow is None:
            return
        lens = self.lens_now()
        ratio = painter.device().devicePixelRatioF()
        if not self._still_good(lens, ratio):
            self._draw_sheet(lens, ratio)
        before, self.painted = self._drawn_for, self.flow
        painter.drawPixmap(
            QPointF(
                lens.left - before.left - self.MARGIN * lens.width,
                lens.top - before.top - self.MARGIN * lens.height,
            ),
            self._sheet,
        )

    def _still_good(self, lens: Lens, ratio: float) -> bool:
        before = self._drawn_for
        return (
            self._sheet is not None
            and lens.same_scale(before)
            and self._sheet.devicePixelRatio() == ratio
            and abs(lens.left - before.left) <= self.MARGIN * lens.width
            and abs(lens.top - before.top) <= self.MARGIN * lens.height
        )

    def _draw_sheet(self, lens: Lens, ratio: float) -> None:
        over = 1 + 2 * self.MARGIN
        sheet = QPixmap(max(1, round(over * lens.width * ratio)), max(1, round(over * lens.height * ratio)))
        sheet.setDevicePixelRatio(ratio)
        sheet.fill(Qt.GlobalColor.transparent)
        flow = self.flow
        with QPainter(sheet) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.translate(self.MARGIN * lens.width, self.MARGIN * lens.height)
            self._arrows.paint(
                painter,
                lens,
                flow.field,
                flow.theme,
                flow.scale,
                tint=flow.tint,
                rejected=flow.rejected,
            )
            self._marks.paint(painter, lens, flow.field, flow.theme)
        self._sheet, self._drawn_for = sheet, lens


@dataclass(frozen=True, eq=False)
class Sketch:
    """What a tool has drawn so far, in the plane: points, whether it will be closed, and a hint."""

    points: tuple[complex, ...]
    closed: bool = False
    vertices: bool = True
    colour: str | None = None
    brush_pixels: float | None = None


class SketchLayer(Layer):
    """The drawing under way."""

    def __init__(self, view_box, lens_now):
        super().__init__(view_box, lens_now, 20)
        self._sketch: Sketch | None = None
        self._theme: Theme | None = None

    def show(self, sketch: Sketch | None, theme: Theme) -> None:
        self._sketch, self._theme = sketch, theme
        self.update()

    def paint(self, painter, option, widget=None):
        sketch = self._sketch
        if sketch is None or not sketch.points:
            return
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        colour = QColor(sketch.colour or self._theme.accent)
        at = self.lens_now().to_pixels(np.array(sketch.points))
        if sketch.brush_pixels:
            painter.setPen(QPen(colour, 1.2))
            painter.drawEllipse(QPointF(at[-1].real, at[-1].imag), sketch.brush_pixels, sketch.brush_pixels)
            return
        path = QPainterPath()
        path.addPolygon(polygon(at))
        if sketch.closed and at.size > 2:
            path.closeSubpath()
        painter.setPen(QPen(colour, 1.8))
        painter.drawPath(path)
        if sketch.vertices:
            painter.setBrush(QColor(self._theme.canvas))
            painter.setPen(QPen(colour, 1.2))
            for z in at:
                painter.drawRect(QRectF(z.real - 3, z.imag - 3, 6, 6))
