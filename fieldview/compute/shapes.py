"""Contours and open lines in the plane."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Self

import numpy as np

ROUND_VERTICES = 720
"""Vertices of the polygon that stands for a circle or an ellipse.

The polygon has the curve's own area: its vertices lie outside by a factor sqrt(t / sin t), t = 2 pi / n,
so that the signed strip between polygon and curve has no area on any edge. What is left of a line or area
integral, against a polygon of 16 times as many vertices: below 2e-9 of it on a smooth field, below 1e-6 of
it (and of speed times length) on a vortex with 2 % noise and radii up to 300 cells, where an edge spans
more than a cell. The bilinear kinks of pure noise leave some 1e-6 of speed times length at that radius.
"""


class _Pointed:
    """What shapes given by ``points`` share."""

    def scaled(self, factor: float) -> Self:
        """The shape scaled about its centroid."""
        return self._mapped(lambda z: self.centroid + factor * (z - self.centroid))

    def shifted(self, offset: complex) -> Self:
        return self._mapped(lambda z: z + offset)

    def turned(self, angle: float, about: complex | None = None) -> Self:
        """Turned counter-clockwise by ``angle`` [rad] about a point (the centroid if left out)."""
        centre = self.centroid if about is None else about
        return self._mapped(lambda z: centre + (z - centre) * complex(math.cos(angle), math.sin(angle)))

    def _mapped(self, change) -> Self:
        moved = change(np.array([complex(*p) for p in self.points]))
        return replace(self, points=tuple((float(z.real), float(z.imag)) for z in moved))


@dataclass(frozen=True)
class Polygon(_Pointed):
    """A closed contour through ``points``: tuple of (x, y). [length]"""

    points: tuple[tuple[float, float], ...]
    closed = True

    @cached_property
    def vertices(self) -> np.ndarray:
        """Complex ndarray (n,) of the corners, counter-clockwise, not repeated at the end. [length]"""
        z = _complex(self.points)
        return z if _signed_area(z) >= 0 else z[::-1]

    @cached_property
    def area(self) -> float:
        """[length^2]"""
        return abs(_signed_area(self.vertices))

    @cached_property
    def length(self) -> float:
        """Length of the contour. [length]"""
        z = self.vertices
        return float(np.abs(np.diff(z)).sum() + abs(z[0] - z[-1]))

    @property
    def centroid(self) -> complex:
        """Centre of area, or of the vertices where there is no area."""
        return _centroid(self.vertices)

    def contains(self, z: np.ndarray) -> np.ndarray:
        """Whether plane points ``z`` (complex, any shape) lie inside or on the contour: bool, same shape."""
        import shapely

        z = np.asarray(z)
        ring = shapely.Polygon(np.column_stack([self.vertices.real, self.vertices.imag]))
        shapely.prepare(ring)
        return shapely.intersects_xy(ring, z.real, z.imag)

    def problem(self) -> str | None:
        """Why the contour has no answer, in words; None where it is sound."""
        return self._problem

    @cached_property
    def _problem(self) -> str | None:
        # the points do not change, and every measurement asks
        import shapely

        z = self.vertices
        if not np.isfinite(z).all():
            return "the contour has coordinates that are not numbers"
        if self.area <= 1e-14 * self.length**2 and _in_line(z):
            return "the contour encloses no area; give at least three corners that are not in line"
        apart = z[1:] != z[:-1]
        corners = z if apart.all() else z[np.append(True, apart)]
        ring = shapely.LinearRing(np.ascontiguousarray(corners).view(float).reshape(-1, 2))
        if not ring.is_simple:
            return "the contour crosses itself; redraw it without crossings"
        return None


@dataclass(frozen=True)
class Ellipse:
    """A closed elliptical contour; with equal semi-axes a circle.

    Attributes
    ----------
    centre : (float, float)
    semi_axes : (float, float)
    angle : float
        Of the first semi-axis, counter-clockwise from +x. [rad]
    """

    centre: tuple[float, float]
    semi_axes: tuple[float, float]
    angle: float = 0.0
    closed = True

    @cached_property
    def vertices(self) -> np.ndarray:
        """Complex ndarray (ROUND_VERTICES,) of a polygon with the curve's own area, see there."""
        step = 2 * math.pi / ROUND_VERTICES
        t = step * np.arange(ROUND_VERTICES)
        a, b = self.semi_axes
        ring = math.sqrt(step / math.sin(step)) * (a * np.cos(t) + 1j * b * np.sin(t))
        return complex(*self.centre) + ring * complex(math.cos(self.angle), math.sin(self.angle))

    @property
    def area(self) -> float:
        return math.pi * self.semi_axes[0] * self.semi_axes[1]

    @property
    def length(self) -> float:
        """Perimeter of the curve itself. [length]"""
        from scipy.special import ellipe

        long, short = max(self.semi_axes), min(self.semi_axes)
        return float(4 * long * ellipe(1 - (short / long) ** 2))

    @property
    def centroid(self) -> complex:
        return complex(*self.centre)

    def scaled(self, factor: float) -> Ellipse:
        return replace(self, semi_axes=(factor * self.semi_axes[0], factor * self.semi_axes[1]))

    def shifted(self, offset: complex) -> Ellipse:
        return replace(self, centre=(self.centre[0] + offset.real, self.centre[1] + offset.imag))

    def turned(self, angle: float, about: complex | None = None) -> Ellipse:
        """Turned counter-clockwise by ``angle`` [rad] about a point (the centre if left out)."""
        centre = self.centroid if about is None else about
        moved = centre + (self.centroid - centre) * complex(math.cos(angle), math.sin(angle))
        return replace(self, centre=(moved.real, moved.imag), angle=self.angle + angle)

    def contains(self, z: np.ndarray) -> np.ndarray:
        """Whether plane points ``z`` (complex, any shape) lie inside or on the curve: bool, same shape."""
        local = (np.asarray(z) - self.centroid) * complex(math.cos(self.angle), -math.sin(self.angle))
        return (local.real / self.semi_axes[0]) ** 2 + (local.imag / self.semi_axes[1]) ** 2 <= 1

    def problem(self) -> str | None:
        if not np.isfinite([*self.centre, *self.semi_axes, self.angle]).all() or min(self.semi_axes) <= 0:
            return "the radius or semi-axis of the contour must be a positive number"
        return None


@dataclass(frozen=True)
class Line(_Pointed):
    """An open line through ``points`` in drawn order; its normal is to the right of travel."""

    points: tuple[tuple[float, float], ...]
    closed = False

    @cached_property
    def vertices(self) -> np.ndarray:
        return _complex(self.points)

    @property
    def length(self) -> float:
        return float(np.abs(np.diff(self.vertices)).sum())

    @property
    def centroid(self) -> complex:
        return complex(self.vertices.mean())

    def problem(self) -> str | None:
        z = self.vertices
        if not np.isfinite(z).all():
            return "the line has coordinates that are not numbers"
        if self.length == 0:
            return "the line has no length; give at least two different points"
        return None


Shape = Polygon | Ellipse | Line


def _in_line(z: np.ndarray) -> bool:
    """Whether all points lie on one straight line, or are one point."""
    offsets = z - z[0]
    far = offsets[np.abs(offsets).argmax()]
    return bool((np.abs((offsets * np.conj(far)).imag) <= 1e-13 * abs(far) ** 2).all())


def rectangle(corners) -> Polygon:
    """The rectangle along the axes with these two opposite corners, ((x0, y0), (x1, y1))."""
    (x0, y0), (x1, y1) = corners
    return Polygon(((x0, y0), (x1, y0), (x1, y1), (x0, y1)))


def circle(centre, radius: float) -> Ellipse:
    return Ellipse(tuple(centre), (radius, radius))


def _complex(points) -> np.ndarray:
    return np.ascontiguousarray(points, float).reshape(-1, 2).view(complex).reshape(-1)


def _signed_area(z: np.ndarray) -> float:
    # taken from the first corner, so that far-off origins cost no digits
    arms = z[1:] - z[0]
    return 0.5 * float((arms[:-1].conj() * arms[1:]).imag.sum())


def _centroid(z: np.ndarray) -> complex:
    arms = z - z[0]
    following = np.roll(arms, -1)
    cross = arms.real * following.imag - following.real * arms.imag
    area = cross.sum()
    if abs(area) < 1e-14 * np.abs(arms).max() ** 2:
        return complex(z.mean())
    return complex(z[0] + ((arms + following) * cross).sum() / (3 * area))
