"""Thousands of arrows as a few calls, thinned to what the eye can hold."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from pyqtgraph.Qt import internals
from PySide6.QtCore import QLineF, Qt
from PySide6.QtGui import QColor, QPainter, QPen

from fieldview.compute.field import Field, Status
from fieldview.gui.canvas.lens import Lens
from fieldview.gui.theme import Theme

LEAST_PIXELS = 12.0
"""Arrows stand at least this far apart on the screen."""

_HEAD = 0.32
_SHORTEST, _LONGEST = 14.0, 46.0


@dataclass(frozen=True)
class Thinning:
    """Every how many nodes along x and y an arrow is drawn."""

    x: int = 1
    y: int = 1

    @property
    def sentence(self) -> str:
        if self.x == self.y == 1:
            return "every vector shown"
        if self.x == self.y:
            return f"every {_ordinal(self.x)} vector shown"
        return f"every {_ordinal(self.x)} vector along x and {_ordinal(self.y)} along y shown"


@dataclass(frozen=True, eq=False)
class Tint:
    """Colours of arrows by a quantity: index of each node (uint8 (ny, nx)) in a table (256, 3)."""

    levels: np.ndarray
    table: np.ndarray


@dataclass(frozen=True)
class ArrowScale:
    """Length of arrows on the screen: ``pixels`` for the speed ``speed``; locked from frame to frame."""

    speed: float
    pixels: float

    @property
    def per_speed(self) -> float:
        return self.pixels / self.speed if self.speed > 0 else 0.0


def thinning(field: Field, lens: Lens) -> Thinning:
    """The coarsest thinning that is needed for the screen distance."""
    return Thinning(*(_every(spacing * lens.scale) for spacing in field.grid.spacing))


def arrow_scale(field: Field, lens: Lens, speed: float, stretch: float = 1.0) -> ArrowScale:
    """An arrow of ``speed`` reaches about to the next arrow drawn."""
    thin = thinning(field, lens)
    gaps = [
        g * n * lens.scale
        for g, n in zip(field.grid.spacing, (thin.x, thin.y), strict=True)
        if math.isfinite(g)
    ]
    length = min(max(min(gaps, default=_LONGEST), _SHORTEST), _LONGEST)
    return ArrowScale(speed, 1.15 * length * stretch)


def typical_speed(field: Field) -> float:
    """The speed that few arrows exceed, for the length of arrows on the screen. [velocity]"""
    if not field.in_plane:
        return 0.0
    speed = np.hypot(field.u, field.v)
    known = speed[np.isfinite(speed)]
    return float(np.percentile(known, 90)) if known.size else 0.0


class ArrowPainter:
    """Draws the arrows of one field; keeps its arrays between repaints."""

    def __init__(self):
        self._lines = internals.PrimitiveArray(QLineF, 4)

    def paint(
        self,
        painter: QPainter,
        lens: Lens,
        field: Field,
        theme: Theme,
        scale: ArrowScale,
        *,
        tint: Tint | None = None,
        rejected: bool = False,
    ) -> None:
        """Measured arrows in ink or in the colours of a quantity, filled ones in violet."""
        if not field.in_plane:
            return
        pick = shown_nodes(field, lens)
        self._paint_group(painter, lens, field, pick, Status.MEASURED, theme.ink, scale, tint)
        self._paint_group(painter, lens, field, pick, Status.FILLED, theme.filled, scale, None)
        if rejected:
            self._paint_rejected(painter, lens, field, theme, scale)

    def _paint_group(self, painter, lens, field, pick, status, colour, scale, tint):
        chosen = field.status[pick] == status
        tails = lens.to_pixels(field.grid.nodes[pick][chosen])
        velocity = (field.u[pick] + 1j * field.v[pick])[chosen]
        if tint is None:
            self._draw(painter, tails, velocity * scale.per_speed, QPen(QColor(colour), 1.1))
            return
        level = tint.levels[pick][chosen] // 16
        for step in np.unique(level):
            pen = QPen(QColor(*(int(c) for c in tint.table[int(step) * 16 + 8])), 1.3)
            part = level == step
            self._draw(painter, tails[part], velocity[part] * scale.per_speed, pen)

    def _paint_rejected(self, painter, lens, field, theme, scale):
        rejected = (field.status == Status.REJECTED) | field.once_rejected
        u, v = field.measured.get("u"), field.measured.get("v")
        if u is None or v is None or not rejected.any():
            return
        reach = (u + 1j * v)[rejected] * scale.per_speed
        length = np.abs(reach)
        # an outlier may be a hundred times too long: cut to what still shows its direction
        reach = np.where(length > 90, reach * (90 / np.maximum(length, 1e-30)), reach)
        pen = QPen(QColor(theme.attention), 1.0, Qt.PenStyle.DashLine)
        self._draw(painter, lens.to_pixels(field.grid.nodes[rejected]), reach, pen)

    def _draw(self, painter: QPainter, tails: np.ndarray, reach: np.ndarray, pen: QPen) -> None:
        """Arrows from ``tails`` (pixels) by ``reach`` (pixels, y up)."""
        known = np.isfinite(tails) & np.isfinite(reach) & (np.abs(reach) > 0.5)
        tails, reach = tails[known], np.conj(reach[known])
        if tails.size == 0:
            return
        tips = tails + reach
        length = np.abs(reach)
        barb = reach / length * np.minimum(_HEAD * length, 6.0)
        self._lines.resize(3 * tails.size)
        memory = self._lines.ndarray().reshape(3, tails.size, 4)
        for part, (start, end) in zip(
            memory,
            ((tails, tips), (tips, tips - barb * (1 + 0.5j)), (tips, tips - barb * (1 - 0.5j))),
            strict=True,
        ):
            part[:, 0], part[:, 1] = start.real, start.imag
            part[:, 2], part[:, 3] = end.real, end.imag
        pen.setCapStyle(Qt.PenCapStyle.FlatCap)
        painter.setPen(pen)
        painter.drawLines(*self._lines.drawargs())


def shown_nodes(field: Field, lens: Lens) -> tuple[slice, slice]:
    """The nodes that get an arrow: thinned, and for unturned axes only those on the screen."""
    thin = thinning(field, lens)
    ny, nx = field.grid.shape
    rows, columns = slice((ny - 1) % thin.y // 2, ny, thin.y), slice((nx - 1) % thin.x // 2, nx, thin.x)
    if not field.grid.placement.is_identity:
        return rows, columns
    low = lens.to_plane(complex(-0.5 * lens.width - 60, 1.5 * lens.height + 60))
    high = lens.to_plane(complex(1.5 * lens.width + 60, -0.5 * lens.height - 60))
    return (
        _within(rows, field.grid.y, float(low.imag), float(high.imag)),
        _within(columns, field.grid.x, float(low.real), float(high.real)),
    )


def _within(part: slice, axis: np.ndarray, low: float, high: float) -> slice:
    first, last = np.searchsorted(axis, [low, high])
    start = part.start + max(0, -(-(int(first) - part.start) // part.step)) * part.step
    return slice(start, min(part.stop, int(last)), part.step)


def _every(pixels: float) -> int:
    if not math.isfinite(pixels) or pixels <= 0:
        return 1
    return max(1, math.ceil(LEAST_PIXELS / pixels - 1e-9))


def _ordinal(n: int) -> str:
    ending = "th" if 10 <= n % 100 <= 20 else {1: "st", 2: "nd", 3: "rd"}.get(n % 10, "th")
    return f"{n}{ending}"
