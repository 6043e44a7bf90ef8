"""Node marks: shape first, colour second."""

from __future__ import annotations

import numpy as np
from pyqtgraph.Qt import internals
from PySide6.QtCore import QLineF, QPointF, Qt
from PySide6.QtGui import QBrush, QColor, QPainter, QPainterPath, QPen, QPixmap, QPolygonF, QTransform

from fieldview.compute.field import Field, Status
from fieldview.gui.canvas.arrows import shown_nodes
from fieldview.gui.canvas.lens import Lens
from fieldview.gui.theme import Theme

MOST_MARKS = 4000
"""Beyond so many marks of a kind only those of the shown vectors are drawn."""

_RING, _CROSS, _DOT = 2.6, 2.8, 1.3


class MarkPainter:
    """Rings at filled tails, crosses where a vector was rejected, dots where none was, hatching for masks."""

    def __init__(self):
        self._lines = internals.PrimitiveArray(QLineF, 4)

    def paint(self, painter: QPainter, lens: Lens, field: Field, theme: Theme) -> None:
        paint_hatching(painter, lens, field, theme)
        self._crosses(painter, _places(field, lens, Status.REJECTED), theme)
        _stamps(painter, _places(field, lens, Status.FILLED), _ring(painter, theme.filled))
        _stamps(painter, _places(field, lens, Status.MISSING), _dot(painter, theme.muted))

    def _crosses(self, painter, at, theme):
        if at.size == 0:
            return
        self._lines.resize(2 * at.size)
        memory = self._lines.ndarray().reshape(2, at.size, 4)
        for part, arm in zip(memory, (1 + 1j, 1 - 1j), strict=True):
            start, end = at - _CROSS * arm, at + _CROSS * arm
            part[:, 0], part[:, 1], part[:, 2], part[:, 3] = start.real, start.imag, end.real, end.imag
        painter.setPen(QPen(QColor(theme.attention), 1.4))
        painter.drawLines(*self._lines.drawargs())


def paint_hatching(painter: QPainter, lens: Lens, field: Field, theme: Theme) -> None:
    """Diagonal hatching over the patches of masked nodes."""
    masked = field.status == Status.MASKED
    if not masked.any():
        return
    path = _patches_path(field, masked)
    to_screen = placement_on_screen(field, lens)
    area = to_screen.map(path)
    painter.fillPath(area, QColor(theme.canvas))
    brush = QBrush(QColor(theme.muted), Qt.BrushStyle.BDiagPattern)
    # the pattern is anchored to the plane, so that it travels with the body when the view is panned
    brush.setTransform(QTransform.fromTranslate(lens.left % 8, lens.top % 8))
    painter.fillPath(area, brush)


def placement_on_screen(field: Field, lens: Lens) -> QTransform:
    """Lattice coordinates to pixels."""
    from fieldview.gui.canvas.map_image import placement_transform

    return placement_transform(field.grid.placement) * lens.transform()


def _patches_path(field: Field, nodes: np.ndarray) -> QPainterPath:
    """The patches of these nodes as one path: a rectangle for every unbroken stretch of a row."""
    x_edges, y_edges = _edges(field.grid.x), _edges(field.grid.y)
    path = QPainterPath()
    path.setFillRule(Qt.FillRule.WindingFill)
    for row in np.flatnonzero(nodes.any(axis=1)):
        change = np.flatnonzero(np.diff(np.concatenate([[False], nodes[row], [False]]).astype(np.int8)))
        for start, stop in zip(change[::2], change[1::2], strict=True):
            path.addRect(
                x_edges[start],
                y_edges[row],
                x_edges[stop] - x_edges[start],
                y_edges[row + 1] - y_edges[row],
            )
    return path


def _edges(axis: np.ndarray) -> np.ndarray:
    if axis.size == 1:
        return np.array([axis[0] - 0.5, axis[0] + 0.5])
    middle = (axis[:-1] + axis[1:]) / 2
    return np.concatenate([[2 * axis[0] - middle[0]], middle, [2 * axis[-1] - middle[-1]]])


def _places(field: Field, lens: Lens, status: Status) -> np.ndarray:
    """Pixels of the nodes of this status that are near the screen."""
    nodes = field.grid.nodes[field.status == status]
    if nodes.size > MOST_MARKS:
        pick = shown_nodes(field, lens)
        nodes = field.grid.nodes[pick][field.status[pick] == status]
    at = lens.to_pixels(nodes)
    near = (np.abs(at.real - lens.width / 2) < lens.width) & (np.abs(at.imag - lens.height / 2) < lens.height)
    return at[near]


def _stamps(painter: QPainter, at: np.ndarray, stamp: QPixmap) -> None:
    half = stamp.deviceIndependentSize().width() / 2
    for z in at:
        painter.drawPixmap(QPointF(z.real - half, z.imag - half), stamp)


def _stamp(painter: QPainter, radius: float) -> QPixmap:
    ratio = painter.device().devicePixelRatioF()
    size = 2 * int(np.ceil(radius + 1.5))
    stamp = QPixmap(round(size * ratio), round(size * ratio))
    stamp.setDevicePixelRatio(ratio)
    stamp.fill(Qt.GlobalColor.transparent)
    return stamp


def _ring(painter: QPainter, colour: str) -> QPixmap:
    stamp = _stamp(painter, _RING)
    middle = stamp.deviceIndependentSize().width() / 2
    with QPainter(stamp) as brush:
        brush.setRenderHint(QPainter.RenderHint.Antialiasing)
        brush.setPen(QPen(QColor(colour), 1.2))
        brush.drawEllipse(QPointF(middle, middle), _RING, _RING)
    return stamp


def _dot(painter: QPainter, colour: str) -> QPixmap:
    stamp = _stamp(painter, _DOT)
    middle = stamp.deviceIndependentSize().width() / 2
    with QPainter(stamp) as brush:
        brush.setRenderHint(QPainter.RenderHint.Antialiasing)
        brush.setPen(Qt.PenStyle.NoPen)
        brush.setBrush(QColor(colour))
        brush.drawEllipse(QPointF(middle, middle), _DOT, _DOT)
    return stamp


def polygon(points: np.ndarray) -> QPolygonF:
    """Complex pixels as Qt's polygon."""
    return QPolygonF([QPointF(z.real, z.imag) for z in points])
