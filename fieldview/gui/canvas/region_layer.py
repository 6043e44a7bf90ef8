"""Regions over the field: outline with its dash, handles of the selected one, numbers beside it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QFontMetricsF, QPainter, QPainterPath, QPen

from fieldview.gui import theme as themes
from fieldview.gui.canvas.layers import Layer
from fieldview.gui.canvas.lens import Lens
from fieldview.gui.canvas.marks import polygon
from fieldview.gui.shaping import handles, outline_points
from fieldview.gui.theme import Theme
from fieldview.session.regions import Region

GRIP = 3.5
"""Half the side of a handle. [px]"""


@dataclass(frozen=True, eq=False)
class Marked:
    """One region as it is to be drawn: place in the list, numbers as lines of text, whether selected."""

    region: Region
    place: int
    lines: tuple[str, ...]
    selected: bool
    muted: tuple[bool, ...] = ()


class RegionLayer(Layer):
    def __init__(self, view_box, lens_now):
        super().__init__(view_box, lens_now, 10)
        self._regions: tuple[Marked, ...] = ()
        self._theme: Theme | None = None

    def show(self, regions: tuple[Marked, ...], theme: Theme) -> None:
        self._regions, self._theme = regions, theme
        self.update()

    def paint(self, painter, option, widget=None):
        if not self._regions:
            return
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        lens = self.lens_now()
        taken: list[QRectF] = []
        boxes = [_bounds(lens.to_pixels(outline_points(m.region))) for m in self._regions]
        for marked in sorted(self._regions, key=lambda m: m.selected):
            at = lens.to_pixels(outline_points(marked.region))
            self._outline(painter, at, marked)
        for marked in sorted(self._regions, key=lambda m: not m.selected):
            at = lens.to_pixels(outline_points(marked.region))
            if marked.selected:
                self._handles(painter, lens, marked)
            others = [box for box, m in zip(boxes, self._regions, strict=True) if m is not marked]
            taken.append(self._label(painter, lens, at, marked, taken, others))

    def _outline(self, painter, at, marked):
        path = QPainterPath()
        path.addPolygon(polygon(at))
        if marked.region.shape != "line":
            path.closeSubpath()
        width = 2.2 if marked.selected else 1.8
        halo = QColor(self._theme.canvas)
        halo.setAlphaF(0.7)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.strokePath(path, QPen(halo, width + 2))
        pen = QPen(self._colour(marked), width)
        dash = themes.region_dash(marked.place)
        if dash:
            pen.setDashPattern(dash)
        painter.strokePath(path, pen)
        if marked.region.shape == "line":
            _direction(painter, at, pen)

    def _handles(self, painter: QPainter, lens: Lens, marked: Marked) -> None:
        colour = self._colour(marked)
        painter.setPen(QPen(colour, 1.3))
        for handle in handles(marked.region):
            at = lens.point(handle.at)
            if handle.kind == "insert":
                painter.setBrush(colour)
                painter.drawEllipse(at, 1.8, 1.8)
                continue
            painter.setBrush(QColor(self._theme.canvas))
            if handle.kind == "centre":
                painter.drawEllipse(at, GRIP, GRIP)
            else:
                painter.drawRect(QRectF(at.x() - GRIP, at.y() - GRIP, 2 * GRIP, 2 * GRIP))

    def _colour(self, marked: Marked) -> QColor:
        """The region's colour, made to read on the canvas."""
        own = themes.region_colour(marked.region.colour, marked.place)
        return QColor(themes.legible(own, self._theme))

    def _label(self, painter, lens, at, marked, taken, others) -> QRectF:
        bold, plain = themes.font(pixels=12, bold=True), themes.font(pixels=12)
        widths = [QFontMetricsF(bold).horizontalAdvance(marked.region.name)]
        widths += [QFontMetricsF(plain).horizontalAdvance(line) for line in marked.lines]
        box = QRectF(0, 0, max(widths) + 16, 16 * (1 + len(marked.lines)) + 7)
        box.moveTo(_beside(at, box, lens, taken, others))
        colour = self._colour(marked)
        ground = QColor(self._theme.canvas)
        ground.setAlphaF(0.93)
        painter.setBrush(ground)
        painter.setPen(QPen(colour, 1.0))
        painter.drawRoundedRect(box, 3, 3)
        painter.setFont(bold)
        painter.setPen(colour)
        line = QRectF(box.left() + 8, box.top() + 3, box.width() - 16, 16)
        painter.drawText(line, Qt.AlignmentFlag.AlignVCenter, marked.region.name)
        painter.setFont(plain)
        muted = marked.muted or (False,) * len(marked.lines)
        for text, quiet in zip(marked.lines, muted, strict=True):
            line.translate(0, 16)
            painter.setPen(QColor(self._theme.muted if quiet else self._theme.text))
            painter.drawText(line, Qt.AlignmentFlag.AlignVCenter, text)
        return box


def _beside(at: np.ndarray, box: QRectF, lens: Lens, taken: list[QRectF], others: list[QRectF]) -> QPointF:
    """The place for a label that hides least: on the screen, clear of other labels, then of other regions,
    and no farther from its own region than it must."""
    around, wide, high = _bounds(at), box.width(), box.height()
    left, right, top, bottom = around.left(), around.right(), around.top(), around.bottom()
    inside = lens.rect.adjusted(4, 4, -4, -4)
    columns = (right + 8, left - wide - 8, (left + right - wide) / 2, left, right - wide)
    rows = (top, bottom - high, top - high - 8, bottom + 8, top - 2 * high - 12, bottom + high + 12)
    x = np.clip(np.tile(columns, len(rows)), inside.left(), max(inside.left(), inside.right() - wide))
    y = np.clip(np.repeat(rows, len(columns)), inside.top(), max(inside.top(), inside.bottom() - high))
    apart = np.hypot(x + wide / 2 - around.center().x(), y + high / 2 - around.center().y())
    hidden = 200 * _covered(x, y, box, taken) + _covered(x, y, box, [*others, around]) + 4 * apart
    best = int(np.argmin(hidden))
    return QPointF(x[best], y[best])


def _covered(x: np.ndarray, y: np.ndarray, box: QRectF, others: list[QRectF]) -> np.ndarray:
    """Area that a box at each of these places shares with others. [px²]"""
    area = np.zeros(x.size)
    for other in others:
        wide = np.minimum(x + box.width(), other.right()) - np.maximum(x, other.left())
        high = np.minimum(y + box.height(), other.bottom()) - np.maximum(y, other.top())
        area += np.clip(wide, 0, None) * np.clip(high, 0, None)
    return area


def _bounds(at: np.ndarray) -> QRectF:
    return QRectF(QPointF(at.real.min(), at.imag.min()), QPointF(at.real.max() + 1e-3, at.imag.max() + 1e-3))


def _direction(painter: QPainter, at: np.ndarray, pen: QPen) -> None:
    """An open head at the line's end: its direction of travel."""
    arms = np.diff(at)
    arms = arms[np.abs(arms) > 1e-9]
    if arms.size == 0:
        return
    along = arms[-1] / abs(arms[-1])
    solid = QPen(pen.color(), pen.widthF())
    painter.setPen(solid)
    for side in (1 + 0.6j, 1 - 0.6j):
        barb = at[-1] - 10 * along * side
        painter.drawLine(QPointF(at[-1].real, at[-1].imag), QPointF(barb.real, barb.imag))
