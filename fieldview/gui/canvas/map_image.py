"""A quantity as an image that lies on the lattice."""

from __future__ import annotations

import cmath
from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QRectF
from PySide6.QtGui import QImage, QTransform

from fieldview.compute.grid import Grid, Placement

MOST_PIXELS = 2048


@dataclass(frozen=True)
class MapImage:
    """An image and where it lies: ``rect`` in lattice coordinates, ``placement`` to the plane."""

    image: QImage
    rect: QRectF
    placement: QTransform


def map_image(values: np.ndarray, grid: Grid, colours: np.ndarray, low: float, high: float) -> MapImage:
    """Every node as a patch that reaches half way to its neighbours; transparent where there is no value.

    Parameters
    ----------
    values : ndarray (ny, nx)
    colours : uint8 ndarray (256, 3)
    low, high : float
        Values of the first and the last colour; what lies beyond takes the end colours.
    """
    columns, x_edges = _patches(grid.x, grid.spacing[1])
    rows, y_edges = _patches(grid.y, grid.spacing[0])
    if columns is not None or rows is not None:
        columns = np.arange(grid.x.size) if columns is None else columns
        rows = np.arange(grid.y.size) if rows is None else rows
        values = values[np.ix_(rows, columns)]
    span = high - low if high > low else 1.0
    scaled = (values - low) * (255.0 / span)
    present = np.isfinite(scaled)
    level = np.clip(np.where(present, scaled, 0.0) + 0.5, 0, 255).astype(np.uint8)
    argb = np.append(_packed(colours), 0).astype(np.uint32)
    pixels = argb[np.where(present, level.astype(np.int16), 256)]
    height, width = pixels.shape
    image = QImage(pixels.tobytes(), width, height, 4 * width, QImage.Format.Format_ARGB32_Premultiplied)
    rect = QRectF(x_edges[0], y_edges[0], x_edges[1] - x_edges[0], y_edges[1] - y_edges[0])
    return MapImage(image.copy(), rect, placement_transform(grid.placement))


def placement_transform(placement: Placement) -> QTransform:
    """A grid's placement as Qt's transform of lattice coordinates to the plane."""
    f, sign = placement.factor, -1.0 if placement.mirrored else 1.0
    # z -> f·(x + i·sign·y) + shift
    return QTransform(
        f.real, f.imag, -sign * f.imag, sign * f.real, placement.shift.real, placement.shift.imag
    )


def outline(grid: Grid) -> np.ndarray:
    """Corners of the grid's patches in the plane: complex ndarray (4,)."""
    (_, (x0, x1)), (_, (y0, y1)) = _patches(grid.x, grid.spacing[1]), _patches(grid.y, grid.spacing[0])
    return grid.placement.to_plane(np.array([complex(x0, y0), x1 + 1j * y0, x1 + 1j * y1, x0 + 1j * y1]))


def turn_angle(placement: Placement) -> float:
    """Angle of the lattice's x axis in the plane. [rad]"""
    return cmath.phase(placement.factor)


def _patches(axis: np.ndarray, spacing_across: float) -> tuple[np.ndarray | None, tuple[float, float]]:
    """Node of every image column (None: one each) and the outer edges of the patches."""
    if axis.size == 1:
        half = 0.5 * spacing_across if np.isfinite(spacing_across) else 0.5
        return None, (axis[0] - half, axis[0] + half)
    steps = np.diff(axis)
    edges = (axis[0] - steps[0] / 2, axis[-1] + steps[-1] / 2)
    if np.ptp(steps) <= 1e-3 * steps.mean():
        return None, edges
    count = int(min(MOST_PIXELS, max(2 * axis.size, np.ceil((edges[1] - edges[0]) / steps.min() * 2))))
    centres = edges[0] + (np.arange(count) + 0.5) * (edges[1] - edges[0]) / count
    return np.searchsorted(axis[:-1] + steps / 2, centres), edges


def _packed(colours: np.ndarray) -> np.ndarray:
    wide = colours.astype(np.uint32)
    return (np.uint32(0xFF) << 24) | (wide[:, 0] << 16) | (wide[:, 1] << 8) | wide[:, 2]
