"""Contours for the tests, and integrals over them by plain means: loops, shapely and Gauss points."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import shapely
from scipy.interpolate import RegularGridInterpolator

from fieldview.compute.grid import Grid, Placement
from fieldview.compute.shapes import Polygon

PLACEMENTS = {
    "as measured": Placement(),
    "turned": Placement().then(turn=0.7, about=1 + 2j, shift=0.3 - 0.1j),
    "mirrored": Placement().then(turn=-2.1, about=0.5j, reflect="x", shift=-1 + 1j),
    "reflected in y": Placement().then(reflect="y", about=2 + 1j),
}


def star(rng, centre: complex, radius: float, corners: int = 9) -> Polygon:
    """A sound polygon of uneven outline around a centre."""
    angles = np.sort(rng.uniform(0, 2 * np.pi, corners))
    while np.diff(angles, append=angles[0] + 2 * np.pi).max() > 2.6:
        angles = np.sort(rng.uniform(0, 2 * np.pi, corners))
    z = centre + radius * rng.uniform(0.4, 1.0, corners) * np.exp(1j * angles)
    return Polygon(tuple((float(p.real), float(p.imag)) for p in z))


def middle(grid: Grid) -> complex:
    """The middle of the grid, in the plane."""
    lattice = complex(0.5 * (grid.x[0] + grid.x[-1]), 0.5 * (grid.y[0] + grid.y[-1]))
    return complex(grid.placement.to_plane(lattice))


def reach(grid: Grid) -> float:
    """Largest radius about the middle that stays in the grid."""
    return float(0.5 * min(np.ptp(grid.x), np.ptp(grid.y)))


def line_integral(velocity: np.ndarray, grid: Grid, vertices: np.ndarray) -> complex:
    """Integral of conj(U) dz along a closed polygon, edge by edge, four Gauss points between grid lines."""
    place = grid.placement
    points, weights = np.polynomial.legendre.leggauss(4)
    at = RegularGridInterpolator((grid.y, grid.x), velocity, bounds_error=True)
    total = 0j
    for p, q in zip(vertices, np.roll(vertices, -1), strict=True):
        a, b = complex(place.to_lattice(p)), complex(place.to_lattice(q))
        cuts = {0.0, 1.0}
        for axis, start, stop in ((grid.x, a.real, b.real), (grid.y, a.imag, b.imag)):
            if start != stop:
                t = (axis - start) / (stop - start)
                cuts |= set(t[(t > 0) & (t < 1)].tolist())
        cuts = sorted(cuts)
        for t0, t1 in pairwise(cuts):
            t = 0.5 * (t0 + t1) + 0.5 * (t1 - t0) * points
            z = a + t * (b - a)
            values = at(np.column_stack([z.imag, z.real]))
            total += 0.5 * (t1 - t0) * (weights * values.conj()).sum() * (q - p)
    return total


def area_integral(values: np.ndarray, grid: Grid, shape: Polygon, cells=None) -> complex:
    """Integral of the bilinear interpolant over the polygon, which shapely cuts into cells and triangles.

    The rule of edge midpoints is exact for quadratics. ``cells`` (ny - 1, nx - 1) says which cells count.
    """
    corners = grid.placement.to_lattice(shape.vertices)
    outline = shapely.Polygon(np.column_stack([corners.real, corners.imag]))
    total = 0.0
    for iy in range(grid.y.size - 1):
        for ix in range(grid.x.size - 1):
            if cells is not None and not cells[iy, ix]:
                continue
            box = shapely.box(grid.x[ix], grid.y[iy], grid.x[ix + 1], grid.y[iy + 1])
            part = shapely.intersection(outline, box)
            if part.area == 0:
                continue
            held = values[iy : iy + 2, ix : ix + 2]
            for triangle in shapely.constrained_delaunay_triangles(part).geoms:
                c = np.array(triangle.exterior.coords)[:3]
                for x, y in 0.5 * (c + np.roll(c, -1, axis=0)):
                    a = (x - grid.x[ix]) / (grid.x[ix + 1] - grid.x[ix])
                    b = (y - grid.y[iy]) / (grid.y[iy + 1] - grid.y[iy])
                    shares = np.array([[(1 - a) * (1 - b), a * (1 - b)], [(1 - a) * b, a * b]])
                    total = total + triangle.area / 3 * (shares * held).sum()
    return total
