"""Weights of line integrals over a contour's pieces, exact for the interpolant of their cells."""

from __future__ import annotations

from functools import cached_property

import numpy as np

from fieldview.compute.grid import Grid
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.pieces import Pieces

_GAUSS_POINTS, _GAUSS_WEIGHTS = np.polynomial.legendre.leggauss(4)


def bilinear_weights(pieces: Pieces, wanted: np.ndarray, grid: Grid) -> NodeWeights:
    """Complex weights of the line integral of the bilinear interpolant over these pieces.

    Parameters
    ----------
    pieces : Pieces
    wanted : bool ndarray (n,)
        Pieces to be taken, all of them inside the grid.
    grid : Grid
    """
    nodes, values = bilinear_entries(pieces, wanted, grid)
    return NodeWeights.gathered(nodes.ravel(), values.ravel())


def bilinear_entries(pieces: Pieces, wanted: np.ndarray, grid: Grid) -> tuple[np.ndarray, np.ndarray]:
    """Corner nodes (4, k) and weights (4, k) of each of the k wanted pieces.

    On a piece the product of the local coordinates has the mean a b + da db / 12.
    """
    iy, ix, a, b, da, db, dz = pieces.taken(wanted)
    both = a * b + da * db / 12
    shares = np.stack([1 - a - b + both, a - both, b - both, both])
    return corner_nodes(iy, ix, grid), shares * dz


def corner_nodes(iy: np.ndarray, ix: np.ndarray, grid: Grid) -> np.ndarray:
    """Flat nodes (4, k) of cells: lower left, lower right, upper left, upper right.

    On a grid of one row or column the far corners, which have no weight there, are the near ones.
    """
    ny, nx = grid.shape
    right, up = int(nx > 1), nx * int(ny > 1)
    first = iy * nx + ix
    return np.stack([first, first + right, first + up, first + up + right])


class KeysLine:
    """Cubic convolution after Keys (1981), IEEE Trans. ASSP 29:1153-1160, with a = -1/2.

    Along each axis that is the cubic Hermite interpolant whose slopes at the nodes are those of the parabola
    through three neighbours; on uneven axes the same is done with the uneven parabola, which is still
    linear in the values and reproduces quadratics. It needs the 4 x 4 nodes around a cell.
    """

    def __init__(self, grid: Grid):
        self.grid = grid

    @cached_property
    def _along_x(self) -> np.ndarray:
        return _hermite_rows(self.grid.x)

    @cached_property
    def _along_y(self) -> np.ndarray:
        return _hermite_rows(self.grid.y)

    def weights(self, pieces: Pieces, wanted: np.ndarray) -> NodeWeights:
        """Complex weights of the line integral over these pieces, all in cells with their 4 x 4 nodes.

        The integrand is of degree six along a piece: four-point Gauss is exact.
        """
        iy, ix, a, b, da, db, dz = pieces.taken(wanted)
        total = np.zeros((4, 4, iy.size))
        of_x, of_y = self._along_x[:, :, ix], self._along_y[:, :, iy]
        for point, weight in zip(0.5 * _GAUSS_POINTS, 0.5 * _GAUSS_WEIGHTS, strict=True):
            at_x = _polynomial(of_x, a + point * da)
            at_y = _polynomial(of_y, b + point * db)
            total += at_y[:, None, :] * (weight * at_x)[None, :, :]
        steps = np.arange(-1, 3)
        nodes = (iy + steps[:, None])[:, None, :] * self.grid.shape[1] + (ix + steps[:, None])[None, :, :]
        return NodeWeights.gathered(nodes.ravel(), (total * dz).ravel())


def _polynomial(coefficients: np.ndarray, t: np.ndarray) -> np.ndarray:
    """(4 powers, 4 nodes, k) at t (k,): (4, k)."""
    c0, c1, c2, c3 = coefficients
    return c0 + t * (c1 + t * (c2 + t * c3))


def _hermite_rows(axis: np.ndarray) -> np.ndarray:
    """Polynomial coefficients (4 powers, 4 nodes, cells) of each cell's interpolant; 0 in the end cells."""
    cells = axis.size - 1
    rows = np.zeros((4, 4, cells))
    if cells < 3:
        return rows
    width = np.diff(axis)
    before, here, after = width[:-2], width[1:-1], width[2:]
    left, right = _parabola_slopes(before, here), _parabola_slopes(here, after)
    d0, d1 = np.zeros((4, cells - 2)), np.zeros((4, cells - 2))
    d0[:3], d1[1:] = left * here, right * here
    f0, f1 = np.zeros((4, 1)), np.zeros((4, 1))
    f0[1], f1[2] = 1.0, 1.0
    inner = rows[:, :, 1:-1]
    inner[0] = f0
    inner[1] = d0
    inner[2] = 3 * (f1 - f0) - 2 * d0 - d1
    inner[3] = 2 * (f0 - f1) + d0 + d1
    return rows


def _parabola_slopes(before: np.ndarray, after: np.ndarray) -> np.ndarray:
    """Weights (3, k) of the slope in the middle of three nodes these distances apart."""
    both = before + after
    return np.stack([-after / (before * both), (after - before) / (before * after), before / (after * both)])
