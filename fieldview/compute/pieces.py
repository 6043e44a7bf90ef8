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
    """Where edges cross the lines of one axis; lengths counted from its first line."""

    lines: np.ndarray
    start: np.ndarray  # of each edge
    extent: np.ndarray  # of each edge
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
    corners = np.append(outline, outline[0]) if closed else outline
    apart = corners[1:] != corners[:-1]
    if not apart.all():
        corners = corners[np.append(True, apart)]
    starts, step = corners[:-1], corners[1:] - corners[:-1]
    place = grid.placement
    on_lattice = place.to_lattice(corners)
    reach = np.finfo(float).eps * 8 * max(np.abs(outline).max(), abs(place.shift))
    along_x, along_y = _cuts(grid.x, on_lattice.real, reach), _cuts(grid.y, on_lattice.imag, reach)

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
    a, da = _local(along_x, ix, edge, middle, share)
    b, db = _local(along_y, iy, edge, middle, share)
    _take_measured_side(along_x, along_y, edge, iy, ix, a, b, cells)
    rise = share * (-along_y.extent if place.mirrored else along_y.extent)[edge]
    return Pieces(iy, ix, a, b, da, db, share * step[edge], rise, edge, middle, (starts, step))


def _cuts(axis: np.ndarray, places: np.ndarray, reach: float) -> _Cuts:
    """Crossings of a chain of places on one axis with its lines.

    Everything is counted from the first line; places within round-off of a line are put on it.
    """
    lines = axis - axis[0] if axis.size > 1 else np.array([0.0, 1.0])
    reach = max(reach, np.finfo(float).eps * 8 * np.abs(axis[[0, -1]]).max(), 1e-12 * lines[-1] / axis.size)
    places = places - axis[0]
    before = lines.searchsorted(places - reach)  # lines below each place
    after = lines.searchsorted(places + reach, "right")
    on = np.flatnonzero(after > before)
    places[on] = lines[before[on]]
    start, extent = places[:-1], places[1:] - places[:-1]
    direction = np.sign(extent).astype(np.int64)
    forward = direction > 0
    count = np.where(forward, before[1:] - after[:-1], before[:-1] - after[1:])
    count = np.maximum(count, 0) * (direction != 0)
    edge = np.repeat(np.arange(start.size), count)
    first_line = np.where(forward, after[:-1], before[:-1] - 1)
    # the numbers of the lines run on with the crossings, up or down
    number = np.arange(edge.size) - (np.cumsum(count) - count)[edge]
    line = first_line[edge] + direction[edge] * number
    t = (lines[line] - start[edge]) / extent[edge]
    first = np.where(direction < 0, before[:-1], after[:-1]) - 1
    on_line = (direction == 0) & (after[:-1] != before[:-1])
    return _Cuts(lines, start, extent, first, direction, on_line, edge, t, count)


def _cells_along(cuts: _Cuts, edges: int, before: int, behind: int, order: np.ndarray) -> np.ndarray:
    """Cell of every piece along one axis: one on at every crossing, set anew where an edge starts."""
    last = cuts.first + cuts.direction * cuts.count
    steps = np.zeros(edges + before + cuts.edge.size + behind, np.int64)
    steps[:edges] = cuts.first
    steps[1:edges] -= last[:-1]
    steps[edges + before : edges + before + cuts.edge.size] = cuts.direction[cuts.edge]
    return np.cumsum(steps[order])


def _local(cuts: _Cuts, cell, edge, middle, share) -> tuple[np.ndarray, np.ndarray]:
    """Middle and extent of every piece in its cell, as shares of the cell's width."""
    held = np.clip(cell, 0, cuts.lines.size - 2)
    per_width = (1.0 / np.diff(cuts.lines))[held]
    extent = cuts.extent[edge]
    inside = (cuts.start[edge] - cuts.lines[held]) + middle * extent
    return inside * per_width, share * extent * per_width


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
