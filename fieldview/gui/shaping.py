"""Handles of regions and what dragging them does. Pure: a region in, a region out."""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass

import numpy as np

from fieldview.session import regions

Region = regions.Region


@dataclass(frozen=True)
class Handle:
    """A place to take hold of a region. ``kind`` is "corner", "side", "centre", "rim" or "insert"."""

    kind: str
    index: int
    at: complex


def handles(region) -> list[Handle]:
    """The handles of a region, in the plane."""
    match region.shape:
        case "circle":
            c = complex(*region.centre)
            rim = [Handle("rim", i, c + region.radius * 1j**i) for i in range(4)]
            return [*rim, Handle("centre", 0, c)]
        case "ellipse":
            c, turn = complex(*region.centre), cmath.rect(1, math.radians(region.angle_deg))
            a, b = region.semi_axes
            arms = (a * turn, 1j * b * turn, -a * turn, -1j * b * turn)
            return [*(Handle("rim", i, c + arm) for i, arm in enumerate(arms)), Handle("centre", 0, c)]
        case "rectangle":
            corners = rectangle_corners(region)
            middles = [(a + b) / 2 for a, b in _pairs(corners, closed=True)]
            return [
                *(Handle("corner", i, z) for i, z in enumerate(corners)),
                *(Handle("side", i, z) for i, z in enumerate(middles)),
            ]
        case _:
            points = [complex(*p) for p in region.points]
            middles = [(a + b) / 2 for a, b in _pairs(points, closed=region.shape == "polygon")]
            return [
                *(Handle("corner", i, z) for i, z in enumerate(points)),
                *(Handle("insert", i, z) for i, z in enumerate(middles)),
            ]


def dragged(region, handle: Handle, to: complex, *, straight: bool = False):
    """The region with this handle taken to a place; ``straight`` keeps it square, round or along an axis."""
    change = _CHANGES[region.shape](region, handle, to, straight)
    return region.model_copy(update=change) if change else region


def moved(region, by: complex):
    """The region shifted by ``by``."""
    shift = lambda p: (p[0] + by.real, p[1] + by.imag)  # noqa: E731
    match region.shape:
        case "circle" | "ellipse":
            return region.model_copy(update={"centre": shift(region.centre)})
        case "rectangle":
            return region.model_copy(update={"corners": tuple(map(shift, region.corners))})
        case _:
            return region.model_copy(update={"points": tuple(map(shift, region.points))})


def without_point(region, index: int):
    """The polygon or line without one of its points; None where too few would be left."""
    least = 3 if region.shape == "polygon" else 2
    if region.shape not in ("polygon", "line") or len(region.points) <= least:
        return None
    points = tuple(p for i, p in enumerate(region.points) if i != index)
    return region.model_copy(update={"points": points})


def straightened(to: complex, anchor: complex) -> complex:
    """``to``, turned about ``anchor`` to the nearest eighth of a turn."""
    arm = to - anchor
    eighth = math.pi / 4
    return anchor + cmath.rect(abs(arm), round(cmath.phase(arm) / eighth) * eighth) if arm else to


def squared(to: complex, anchor: complex) -> complex:
    """The corner opposite ``anchor`` of a square that reaches as far as ``to``."""
    arm = to - anchor
    side = max(abs(arm.real), abs(arm.imag))
    return anchor + complex(math.copysign(side, arm.real), math.copysign(side, arm.imag))


def rectangle_corners(region) -> list[complex]:
    (x0, y0), (x1, y1) = region.corners
    return [complex(x0, y0), complex(x1, y0), complex(x1, y1), complex(x0, y1)]


def outline_points(region) -> np.ndarray:
    """The region's outline in the plane, in drawn order: complex ndarray (n,)."""
    shape = region.outline()
    if region.shape in ("circle", "ellipse"):
        return shape.vertices[::6]
    return np.array([complex(*p) for p in shape.points])


def _circle(region, handle, to, straight):
    if handle.kind == "centre":
        return {"centre": _xy(to)}
    radius = abs(to - complex(*region.centre))
    return {"radius": radius} if radius > 0 else {}


def _ellipse(region, handle, to, straight):
    if handle.kind == "centre":
        return {"centre": _xy(to)}
    arm = to - complex(*region.centre)
    if arm == 0:
        return {}
    first = handle.index % 2 == 0
    semi = (abs(arm), region.semi_axes[1]) if first else (region.semi_axes[0], abs(arm))
    angle = math.degrees(cmath.phase(arm)) - 90 * handle.index
    if straight:
        angle = region.angle_deg
    return {"semi_axes": semi, "angle_deg": (angle + 180) % 360 - 180}


def _rectangle(region, handle, to, straight):
    corners = rectangle_corners(region)
    if handle.kind == "corner":
        fixed = corners[(handle.index + 2) % 4]
        to = squared(to, fixed) if straight else to
        return _between(fixed, to)
    low, high = corners[0], corners[2]
    match handle.index:
        case 0:
            low = complex(low.real, to.imag)
        case 1:
            high = complex(to.real, high.imag)
        case 2:
            high = complex(high.real, to.imag)
        case _:
            low = complex(to.real, low.imag)
    return _between(low, high)


def _points(region, handle, to, straight):
    points = list(region.points)
    if handle.kind == "insert":
        points.insert(handle.index + 1, _xy(to))
        return {"points": tuple(points)}
    if straight:
        neighbour = points[handle.index - 1] if handle.index or region.shape == "polygon" else points[1]
        to = straightened(to, complex(*neighbour))
    points[handle.index] = _xy(to)
    return {"points": tuple(points)}


def _between(one: complex, other: complex) -> dict:
    if one.real == other.real or one.imag == other.imag:
        return {}
    return {
        "corners": (
            (min(one.real, other.real), min(one.imag, other.imag)),
            (max(one.real, other.real), max(one.imag, other.imag)),
        )
    }


def _pairs(points, *, closed):
    following = [*points[1:], points[0]] if closed else points[1:]
    return list(zip(points, following, strict=False))


def _xy(z: complex) -> tuple[float, float]:
    return (float(z.real), float(z.imag))


_CHANGES = {
    "circle": _circle,
    "ellipse": _ellipse,
    "rectangle": _rectangle,
    "polygon": _points,
    "line": _points,
}
