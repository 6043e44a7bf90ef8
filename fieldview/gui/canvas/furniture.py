"""Colour bar and legend: what stands beside and below the axes."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QPointF, QRectF, QSizeF, Qt
from PySide6.QtGui import QBrush, QColor, QFontMetricsF, QImage, QPainter, QPen, QPolygonF
from PySide6.QtWidgets import QGraphicsWidget, QSizePolicy

from fieldview.gui import theme as themes
from fieldview.gui.theme import Theme
from fieldview.publish import wording

_MOST = 16_000.0


@dataclass(frozen=True, eq=False)
class Bar:
    """A colour bar: its colours from low to high, what it measures, and whether values lie beyond."""

    colours: np.ndarray
    low: float
    high: float
    label: str
    below: bool = False
    above: bool = False
    signed: bool = False


class ColourBar(QGraphicsWidget):
    """The scale of the map, as high as the axes; pointed where values lie beyond its range."""

    WIDTH = 92

    def __init__(self):
        super().__init__()
        self._bar: Bar | None = None
        self._theme: Theme | None = None
        self.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Expanding)

    def show_bar(self, bar: Bar | None, theme: Theme) -> None:
        self._bar, self._theme = bar, theme
        self.updateGeometry()
        self.update()

    def sizeHint(self, which, constraint=None):
        width = self.WIDTH if self._bar else 12
        return QSizeF(width, _MOST if which == Qt.SizeHint.MaximumSize else 40)

    def paint(self, painter: QPainter, option, widget=None):
        if self._bar is None:
            return
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        bar, height = self._bar, self.size().height()
        body = QRectF(14, 9, 13, max(10.0, height - 18))
        painter.drawImage(body, _strip(bar.colours))
        self._points(painter, body)
        painter.setFont(themes.font(pixels=themes.SMALL_PIXELS))
        metrics = QFontMetricsF(painter.font())
        step = wording.nice_step(bar.high - bar.low, max(2, int(body.height() // 55)))
        decimals = max(0, -math.floor(math.log10(step)))
        for k in range(math.ceil(bar.low / step - 1e-6), math.floor(bar.high / step + 1e-6) + 1):
            y = body.bottom() - (k * step - bar.low) / (bar.high - bar.low) * body.height()
            painter.setPen(QColor(self._theme.muted))
            painter.drawLine(QPointF(body.right(), y), QPointF(body.right() + 4, y))
            text = wording.fixed(k * step, decimals, signed=bar.signed)
            painter.drawText(QPointF(body.right() + 7, y + metrics.ascent() / 2 - 1), text)
        self._label(painter, height)

    def _points(self, painter, body):
        bar, middle = self._bar, body.center().x()
        painter.setPen(Qt.PenStyle.NoPen)
        for beyond, colour, y, tip in (
            (bar.above, bar.colours[-1], body.top(), body.top() - 8),
            (bar.below, bar.colours[0], body.bottom(), body.bottom() + 8),
        ):
            if beyond:
                painter.setBrush(QColor(*(int(c) for c in colour)))
                painter.drawPolygon(
                    QPolygonF([QPointF(body.left(), y), QPointF(body.right(), y), QPointF(middle, tip)])
                )

    def _label(self, painter, height):
        painter.save()
        painter.setPen(QColor(self._theme.muted))
        painter.translate(self.size().width() - 4, height / 2)
        painter.rotate(-90)
        painter.drawText(QRectF(-height / 2, -16, height, 16), Qt.AlignmentFlag.AlignCenter, self._bar.label)
        painter.restore()


@dataclass(frozen=True, eq=False)
class Key:
    """What the legend says: the reference arrow, the thinning, and the marks that occur."""

    reference: str = ""
    pixels: float = 0.0
    thinning: str = ""
    marks: tuple[tuple[str, str], ...] = ()


class Legend(QGraphicsWidget):
    """One line below the axes: reference arrow, thinning, node marks by shape and colour."""

    def __init__(self):
        super().__init__()
        self._key: Key | None = None
        self._theme: Theme | None = None
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)

    def show_key(self, key: Key | None, theme: Theme) -> None:
        self._key, self._theme = key, theme
        self.update()

    def sizeHint(self, which, constraint=None):
        return QSizeF(_MOST if which == Qt.SizeHint.MaximumSize else 40, 22)

    def paint(self, painter: QPainter, option, widget=None):
        if self._key is None:
            return
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setFont(themes.font(pixels=themes.SMALL_PIXELS))
        metrics = QFontMetricsF(painter.font())
        x = self._reference(painter, metrics, 6.0)
        for kind, text in self._key.marks:
            needed = 30 + metrics.horizontalAdvance(text)
            if x + needed > self.size().width():
                break
            _SIGNS[kind](painter, QPointF(x, 11), self._theme)
            painter.setPen(QColor(self._theme.muted))
            painter.drawText(QPointF(x + 22, 15), text)
            x += needed + 14

    def _reference(self, painter, metrics, x):
        key = self._key
        if key.pixels > 0:
            _arrow(painter, QPointF(x, 11), key.pixels, self._theme.ink)
            x += key.pixels + 8
        text = " · ".join(part for part in (key.reference, key.thinning) if part)
        painter.setPen(QColor(self._theme.muted))
        painter.drawText(QPointF(x, 15), text)
        return x + metrics.horizontalAdvance(text) + 24


def _arrow(painter, at, length, colour):
    painter.setPen(QPen(QColor(colour), 1.2))
    tip = at + QPointF(length, 0)
    painter.drawLine(at, tip)
    barb = min(6.0, 0.32 * length)
    painter.drawLine(tip, tip + QPointF(-barb, -barb / 2))
    painter.drawLine(tip, tip + QPointF(-barb, barb / 2))


def _measured(painter, at, theme):
    _arrow(painter, at, 17, theme.ink)


def _filled(painter, at, theme):
    painter.setBrush(Qt.BrushStyle.NoBrush)
    _arrow(painter, at + QPointF(2.6, 0), 15, theme.filled)
    painter.setBrush(QColor(theme.canvas))
    painter.drawEllipse(at + QPointF(2.6, 0), 2.6, 2.6)


def _rejected(painter, at, theme):
    painter.setPen(QPen(QColor(theme.attention), 1.4))
    middle = at + QPointF(12, 0)
    painter.drawLine(middle + QPointF(-3, -3), middle + QPointF(3, 3))
    painter.drawLine(middle + QPointF(-3, 3), middle + QPointF(3, -3))


def _masked(painter, at, theme):
    box = QRectF(at.x() + 3, at.y() - 5, 14, 10)
    painter.fillRect(box, QColor(theme.canvas))
    painter.setPen(QPen(QColor(theme.muted), 1.0))
    painter.setBrush(QBrush(QColor(theme.muted), Qt.BrushStyle.BDiagPattern))
    painter.drawRect(box)


def _missing(painter, at, theme):
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(QColor(theme.muted))
    painter.drawEllipse(at + QPointF(12, 0), 1.6, 1.6)


_SIGNS = {
    "measured": _measured,
    "filled": _filled,
    "rejected": _rejected,
    "masked": _masked,
    "missing": _missing,
}


def _strip(colours: np.ndarray) -> QImage:
    rgb = np.ascontiguousarray(colours[::-1].reshape(-1, 1, 3))
    return QImage(rgb.tobytes(), 1, rgb.shape[0], 3, QImage.Format.Format_RGB888).copy()
