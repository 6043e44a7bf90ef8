"""A contour cut at the grid lines, so that every piece lies in one cell."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from fieldview.compute.grid import Grid


@dataclass(frozen=True, eq=False)
class Pieces:
    """The n pieces of a contour, in the order of travel.

    Attributes
    ----------
    iy, ix : int ndarray (n,)
        Cell of each piece, named by its lower left node. -1 or the axis's last node is outside the grid.
    a, b : ndarray (n,)
        Middle of the piece in its cell, 0 ... 1 along the lattice's x and y; of no meaning outside.
    da, db : ndarray (n,)
        Extents in the same measure.
    dz : complex ndarray (n,)
        Step in the plane. [length]
    rise : ndarray (n,)
        Step along the lattice's y, with the sign that makes areas positive. [length]
    edge : int ndarray (n,)
        Edge of the contour it is a part of.
    middle : ndarray (n,)
        Place of its middle along that edge, 0 ... 1.
    edges : (complex ndarray, complex ndarray)
        Start and step of every edge in the plane. [length]
    """

    iy: np.ndarray
    ix: np.ndarray
    a: np.ndarray
    b: np.ndarray
    da: np.ndarray
    db: np.ndarray
    dz: np.ndarray
    rise: np.ndarray
    edge: np.ndarray
    middle: np.ndarray
    edges: tuple[np.ndarray, np.ndarray]

    @cached_property
    def lengths(self) -> np.ndarray:
        """(n,) [length]"""
        return np.abs(self.dz)

    def taken(self, wanted: np.ndarray) -> tuple[np.ndarray, ...]:
        """iy, ix, a, b, da, db and dz of the wanted pieces."""
        parts = (self.iy, self.ix, self.a, self.b, self.da, self.db, self.dz)
        return parts if wanted.all() else tuple(part[wanted] for part in parts)

    def places(self) -> np.ndarray:
        """Middles in the plane, complex (n,). [length]"""
        start, step = self.edges
        return start[self.edge] + self.middle * step[self.edge]


@dataclass(frozen=True, eq=False)
class _Cuts:
    """Where edges cross the lines of one axis."""

    first: np.ndarray  # cell in which each edge starts
    direction: np.ndarray  # -1, 0, 1 for each edge
    on_line: np.ndarray  # edges that run along a line
    edge: np.ndarray  # of each crossing
    t: np.ndarray  # place along the edge of each crossing
    count: np.ndarray  # crossings of each edge


def cut(outline: np.ndarray, grid: Grid, cells: np.ndarray, *, closed: bool) -> Pieces:
    """Cut a contour or open line at the grid lines.

    A piece on a grid line is given to the measured one of its two cells. Repeated corners are left out.
    Corners within round-off of a grid line are taken to lie on it.

    Parameters
    ----------
    outline : complex ndarray (k,)
        Corners in the plane. [length]
    grid : Grid
        A grid of one row (column) counts as one row of cells, in which only b = 0 (a = 0) is measured.
    cells : bool ndarray (cells along y + 2, cells along x + 2)
        Measured cells, framed by cells that are not.
    closed : bool
    """
    starts, stops = (outline, np.roll(outline, -1)) if closed else (outline[:-1], outline[1:])
    apart = stops != starts
    if not apart.all():
        starts, stops = starts[apart], stops[apart]
    step = stops - starts
    place = grid.placement
    begin, end = place.to_lattice(starts), place.to_lattice(stops)
    reach = np.finfo(float).eps * 8 * max(np.abs(outline).max(), abs(place.shift))
    x_lines, x0, x1 = _relative(grid.x, begin.real, end.real, reach)
    y_lines, y0, y1 = _relative(grid.y, begin.imag, end.imag, reach)
    along_x, along_y = _cuts(x_lines, x0, x1), _cuts(y_lines, y0, y1)

    count = starts.size
    edge = np.concatenate([np.arange(count), along_x.edge, along_y.edge])
    t = np.concatenate([np.zeros(count), along_x.t, along_y.t])
    order = np.argsort(edge + t, kind="stable")
    edge, t = edge[order], t[order]
    following = np.append(t[1:], 0.0)
    ends = np.where(following == 0, 1.0, following)
    ix = _cells_along(along_x, count, 0, along_y.edge.size, order)
    iy = _cells_along(along_y, count, along_x.edge.size, 0, order)
    middle, share = 0.5 * (t + ends), ends - t
    a, da = _local(x_lines, ix, x0, x1, edge, middle, share)
    b, db = _local(y_lines, iy, y0, y1, edge, middle, share)
    _take_measured_side(along_x, along_y, edge, iy, ix, a, b, cells)
    rise = share * (y1 - y0)[edge] * (-1.0 if place.mirrored else 1.0)
    return Pieces(iy, ix, a, b, da, db, share * step[edge], rise, edge, middle, (starts, step))


def _relative(axis: np.ndarray, p: np.ndarray, q: np.ndarray, reach: float):
    """Lines and edge ends counted from the first line, ends within round-off of a line put on it."""
    lines = axis - axis[0]
    if lines.size == 1:
        lines = np.array([0.0, 1.0])
    reach = max(reach, np.finfo(float).eps * 8 * np.abs(axis).max(), 1e-12 * lines[-1] / (lines.size - 1))
    return lines, _snapped(lines, p - axis[0], reach), _snapped(lines, q - axis[0], reach)


def _snapped(lines: np.ndarray, p: np.ndarray, reach: float) -> np.ndarray:
    upper = np.minimum(np.searchsorted(lines, p), lines.size - 1)
    nearest = np.where(
        np.abs(lines[upper] - p) < np.abs(lines[upper - 1] - p), lines[upper], lines[upper - 1]
    )
    return np.where(np.abs(nearest - p) <= reach, nearest, p)


def _cuts(lines: np.ndarray, p: np.ndarray, q: np.ndarray) -> _Cuts:
    after_p, before_p = np.searchsorted(lines, p, "right"), np.searchsorted(lines, p, "left")
    after_q, before_q = np.searchsorted(lines, q, "right"), np.searchsorted(lines, q, "left")
    direction = np.sign(q - p).astype(int)
    count = np.where(direction > 0, before_q - after_p, np.where(direction < 0, before_p - after_q, 0))
    count = np.maximum(count, 0)
    edge = np.repeat(np.arange(p.size), count)
    number = np.arange(edge.size) - (np.cumsum(count) - count)[edge]
    line = np.where(direction > 0, after_p, before_p - 1)[edge] + direction[edge] * number
    t = (lines[line] - p[edge]) / (q - p)[edge]
    first = np.where(direction < 0, before_p, after_p) - 1
    return _Cuts(first, direction, (direction == 0) & (after_p != before_p), edge, t, count)


def _cells_along(cuts: _Cuts, edges: int, before: int, behind: int, order: np.ndarray) -> np.ndarray:
    """Cell of every piece along one axis: one on at every crossing, set anew where an edge starts."""
    last = cuts.first + cuts.direction * cuts.count
    steps = np.zeros(edges + before + cuts.edge.size + behind, np.int64)
    steps[:edges] = cuts.first
    steps[1:edges] -= last[:-1]
    steps[edges + before : edges + before + cuts.edge.size] = cuts.direction[cuts.edge]
    return np.cumsum(steps[order])


def _local(lines, cell, p, q, edge, middle, share) -> tuple[np.ndarray, np.ndarray]:
    held = np.clip(cell, 0, lines.size - 2)
    per_width = (1.0 / np.diff(lines))[held]
    extent = q - p
    inside = (p[edge] - lines[held]) + middle * extent[edge]
    return inside * per_width, share * extent[edge] * per_width


def _take_measured_side(along_x: _Cuts, along_y: _Cuts, edge, iy, ix, a, b, cells) -> None:
    """Give pieces on a grid line to the cell below or to the left of it where the other is not measured."""
    for cuts, cell, local in ((along_x, ix, a), (along_y, iy, b)):
        if not cuts.on_line.any():
            continue
        pieces = np.flatnonzero(cuts.on_line[edge])
        other = pieces[~cells[iy[pieces] + 1, ix[pieces] + 1]]
        back = np.array([cell is iy, cell is ix], int)
        better = other[cells[iy[other] + 1 - back[0], ix[other] + 1 - back[1]]]
        cell[better] -= 1
        local[better] = 1.0
