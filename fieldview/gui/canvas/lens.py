"""How the plane lies on the screen at this moment."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QTransform


@dataclass(frozen=True)
class Lens:
    """Plane coordinates to pixels of the view box: px = left + scale·x, py = top - scale·y.

    ``width`` and ``height`` are the view box's in pixels. Scales are equal on both axes and y points up.
    """

    scale: float
    left: float
    top: float
    width: float
    height: float

    def to_pixels(self, z):
        """Pixels (complex, y down) of plane points x + iy."""
        z = np.asarray(z)
        return (self.left + self.scale * z.real) + 1j * (self.top - self.scale * z.imag)

    def to_plane(self, pixels):
        """Plane points of pixels (complex, y down)."""
        pixels = np.asarray(pixels)
        return (pixels.real - self.left) / self.scale + 1j * (self.top - pixels.imag) / self.scale

    def point(self, z: complex) -> QPointF:
        return QPointF(self.left + self.scale * z.real, self.top - self.scale * z.imag)

    @property
    def rect(self) -> QRectF:
        return QRectF(0, 0, self.width, self.height)

    def transform(self) -> QTransform:
        """The same map as Qt's transform of plane coordinates."""
        return QTransform(self.scale, 0, 0, -self.scale, self.left, self.top)

    def same_scale(self, other: Lens | None) -> bool:
        return (
            other is not None
            and abs(other.scale - self.scale) <= 1e-9 * self.scale
            and (other.width, other.height) == (self.width, self.height)
        )
