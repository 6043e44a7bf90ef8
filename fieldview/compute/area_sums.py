"""Area integrals of the bilinear interpolant over a polygon, exact, by Green's theorem.

The integral of f over the area is that of F dy over its contour, F the antiderivative of f along the
lattice's x within each row of cells. On a piece F is quadratic in a and linear in b, so its integral is a
sum of the moments of the piece with the running sums up to its cell and the cell's own corners.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.grid import Grid
from fieldview.compute.line_weights import corner_nodes
from fieldview.compute.pieces import Pieces


@dataclass(frozen=True, eq=False)
class AreaPieces:
    """What of a piece's F dy multiplies what.

    Attributes
    ----------
    iy, ix : int ndarray (n,)
        Cell, kept to the rows and columns of the running sums.
    lower, upper : ndarray (n,)
        Factors of the running sums along the lower and upper edge of the row; 0 above and below the grid.
    corners : ndarray (4, k)
        Factors of the corners of the k own cells that are measured. [length^2]
    own : int ndarray (k,)
        Which pieces those are.
    nodes : int ndarray (4, k)
        Their flat nodes.
    """

    iy: np.ndarray
    ix: np.ndarray
    lower: np.ndarray
    upper: np.ndarray
    corners: np.ndarray
    own: np.ndarray
    nodes: np.ndarray


def area_pieces(pieces: Pieces, grid: Grid, measured: np.ndarray) -> AreaPieces:
    """Factors for a closed contour.

    Parameters
    ----------
    pieces : Pieces
    grid : Grid
        With cells.
    measured : bool ndarray (n,)
        Pieces in measured cells.
    """
    ny, nx = grid.shape
    in_rows = (pieces.iy >= 0) & (pieces.iy < ny - 1)
    rise = np.where(in_rows, pieces.rise, 0.0)
    own = np.flatnonzero(measured)
    iy, ix, a, b, da, db, _ = pieces.taken(measured)
    scale = rise[own] * np.diff(grid.x)[ix]
    half_square = 0.5 * (a * a + da * da / 12)
    product = a * b + da * db / 12
    half_square_b = half_square * b + a * da * db / 12
    corners = scale * np.stack(
        [a - half_square - product + half_square_b, half_square - half_square_b, product - half_square_b,
         half_square_b]
    )  # fmt: skip
    inside = np.clip(pieces.b, 0.0, 1.0) if not in_rows.all() else pieces.b
    return AreaPieces(
        np.clip(pieces.iy, 0, ny - 2),
        np.clip(pieces.ix, 0, nx - 1),
        rise * (1 - inside),
        rise * inside,
        corners,
        own,
        corner_nodes(iy, ix, grid),
    )


class RunningSums:
    """Running x-integrals of a nodal quantity along the lower and upper edge of every row of cells.

    Parameters
    ----------
    values : float or complex ndarray (ny, nx)
        Finite everywhere; what stands at nodes of no measured cell is of no account.
    grid : Grid
    cells : bool ndarray (ny - 1, nx - 1)
        Cells that count; the others are left out of the integral.
    """

    def __init__(self, values: np.ndarray, grid: Grid, cells: np.ndarray):
        self.values = np.ascontiguousarray(values).ravel()
        width = np.diff(grid.x)
        means = 0.5 * width * (values[:, 1:] + values[:, :-1])
        self.row = grid.x.size
        if cells.all():
            along = _running(means)
            self.lower, self.upper = along[:-1].ravel(), along[1:].ravel()
        else:
            self.lower = _running(np.where(cells, means[:-1], 0.0)).ravel()
            self.upper = _running(np.where(cells, means[1:], 0.0)).ravel()

    def integral(self, pieces: AreaPieces) -> float | complex:
        """Integral over the measured part of the contour's area."""
        start = pieces.iy * self.row
        here = start + pieces.ix
        # counted from the contour's first column, so that what lies left of it costs no digits
        start += int(pieces.ix.min())
        left = pieces.lower @ (self.lower.take(here) - self.lower.take(start))
        left += pieces.upper @ (self.upper.take(here) - self.upper.take(start))
        return left + (pieces.corners * self.values.take(pieces.nodes)).sum()


class MeasuredArea:
    """Area of the measured cells within a contour: the running sum of a quantity that is 1 there."""

    def __init__(self, grid: Grid, cells: np.ndarray):
        self.widths = _running(np.where(cells, np.diff(grid.x), 0.0))

    def within(self, pieces: AreaPieces) -> float:
        """[length^2]"""
        width = self.widths[pieces.iy, pieces.ix] - self.widths[pieces.iy, int(pieces.ix.min())]
        return float(((pieces.lower + pieces.upper) * width).sum() + pieces.corners.sum())


def area_weights(pieces: AreaPieces, grid: Grid) -> tuple[np.ndarray, tuple[int, int]]:
    """Weights of the node values in the integral over the area, for a contour in measured cells.

    Every piece adds to the corners of its own cell, and to all cells left of it in its row what the running
    sums hold: half the cell's width for each end of its lower and upper edge.

    Returns
    -------
    weights : ndarray (rows, columns)
        On the bounding box of the contour. [length^2]
    corner : (int, int)
        Row and column of its first node.
    """
    nx = grid.shape[1]
    top, left = int(pieces.iy.min()), int(pieces.ix.min())
    rows, columns = int(pieces.iy.max()) - top + 2, int(pieces.ix.max()) - left + 2
    flat = (pieces.iy - top) * columns + (pieces.ix - left)
    # what goes to the upper edge of a row of cells falls on the same nodes as the lower edge of the next
    edges = np.bincount(
        np.concatenate([flat, flat + columns]), np.concatenate([pieces.lower, pieces.upper]), rows * columns
    ).reshape(rows, columns)
    width = 0.5 * np.diff(grid.x)[left : left + columns - 1]
    width = np.pad(width, (0, columns - 1 - width.size))  # a contour along the last line has no cell there
    # the factor of a cell is that of all pieces to the right of it, less those up to it: they cancel in a row
    np.cumsum(edges, axis=1, out=edges)
    edges = edges[:, :-1]
    edges *= width
    node_row, node_column = pieces.nodes // nx - top, pieces.nodes % nx - left
    at = (node_row * columns + node_column).ravel()
    weights = np.bincount(at, pieces.corners.ravel(), rows * columns).reshape(rows, columns)
    weights[:, :-1] -= edges
    weights[:, 1:] -= edges
    return weights, (top, left)


def _running(steps: np.ndarray) -> np.ndarray:
    sums = np.zeros((steps.shape[0], steps.shape[1] + 1), steps.dtype)
    np.cumsum(steps, axis=1, out=sums[:, 1:])
    return sums
