"""One contour or line on a prepared field: what of it is measured, and its weights."""

from __future__ import annotations

from functools import cached_property

import numpy as np

from fieldview.compute.area_sums import AreaPieces, area_pieces, area_weights
from fieldview.compute.field import Status
from fieldview.compute.line_weights import bilinear_weights, corner_nodes
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.pieces import Pieces, cut
from fieldview.compute.prepared import Prepared
from fieldview.compute.rate_weights import rate_weights
from fieldview.compute.shapes import Shape

_WHOLE = 1e-9
"""Share of a contour or area that counts as nothing."""


class Contour:
    """Each attribute is made when first asked for, and kept.

    Parameters
    ----------
    shape : Shape
        Sound: without a `problem`.
    prepared : Prepared
    """

    def __init__(self, shape: Shape, prepared: Prepared):
        self.shape, self.prepared, self.grid = shape, prepared, prepared.grid

    @cached_property
    def problem(self) -> str | None:
        """Why there is no answer at all, in words."""
        wrong = self.shape.problem()
        if wrong is None and self.shape.closed and not self.grid.is_plane:
            wrong = "the grid has a single row or column of nodes, on which a closed contour has no answer"
        return wrong

    @cached_property
    def pieces(self) -> Pieces:
        return cut(self.shape.vertices, self.grid, self.prepared.framed_cells, closed=self.shape.closed)

    @cached_property
    def measured(self) -> np.ndarray:
        """Pieces in measured cells, bool (n,)."""
        pieces = self.pieces
        found = self.prepared.framed_cells[pieces.iy + 1, pieces.ix + 1]
        if self.grid.shape[0] == 1:
            found = found & (pieces.b == 0) & (pieces.db == 0)
        if self.grid.shape[1] == 1:
            found = found & (pieces.a == 0) & (pieces.da == 0)
        return found

    @cached_property
    def contour_share(self) -> float:
        """Measured share of the length."""
        return _share(self._length(self.measured), self.pieces.lengths.sum())

    @cached_property
    def filled_share(self) -> float:
        """Share of the length in cells with a filled corner."""
        filled = self.prepared.filled_cells
        if filled is None:
            return 0.0
        inside = np.flatnonzero(self.measured)
        taken = inside[filled[self.pieces.iy[inside], self.pieces.ix[inside]]]
        return float(self.pieces.lengths[taken].sum() / self.pieces.lengths.sum())

    def _length(self, chosen: np.ndarray) -> float:
        lengths = self.pieces.lengths
        return float(lengths.sum() if chosen.all() else lengths[chosen].sum())

    @property
    def is_whole(self) -> bool:
        return self.contour_share == 1.0

    @cached_property
    def obstacle(self) -> str:
        """Where and why the contour is not measured, in words."""
        first = int(np.flatnonzero(~self.measured & (self.pieces.lengths > 0))[0])
        z = self.pieces.places()[first]
        what = "the contour" if self.shape.closed else "the line"
        does, remedy = self._hindrance(int(self.pieces.iy[first]), int(self.pieces.ix[first]))
        missed = f"{percent(1 - self.contour_share)} of it is not measured"
        return f"{what} {does} at ({z.real:.4g}, {z.imag:.4g}) and {missed}; {remedy}"

    def _hindrance(self, iy: int, ix: int) -> tuple[str, str]:
        """What is in the way in a cell that is not measured, and what to do about it."""
        ny, nx = self.prepared.cells.shape
        if not (0 <= iy < ny and 0 <= ix < nx and self.grid.is_plane):
            return "leaves the grid", "draw it no further than the outermost nodes"
        if (self.prepared.field.status[iy : iy + 2, ix : ix + 2] == Status.MASKED).any():
            return "passes a gap left by the mask", "draw it clear of the mask"
        return "passes a gap", "draw it round the gap or fill the gap"

    # --- the line ----------------------------------------------------------------------------------

    @cached_property
    def bilinear(self) -> NodeWeights:
        """Complex weights of the line integral of the bilinear interpolant."""
        return bilinear_weights(self.pieces, self.measured, self.grid)

    @cached_property
    def corner_nodes(self) -> np.ndarray:
        """Flat corner nodes (4, k) of the measured pieces' cells."""
        iy, ix, *_ = self.pieces.taken(self.measured)
        return corner_nodes(iy, ix, self.grid)

    @cached_property
    def in_keys_cells(self) -> np.ndarray:
        pieces = self.pieces
        return self.measured & self.prepared.keys_cells[pieces.iy + 1, pieces.ix + 1]

    @cached_property
    def cubic_share(self) -> float:
        """Share of the length on which the cubic line is cubic and not bilinear."""
        return float(self.pieces.lengths[self.in_keys_cells].sum() / self.pieces.lengths.sum())

    @cached_property
    def cubic(self) -> NodeWeights:
        """Complex weights of the cubic line, bilinear where its 4 x 4 nodes are not all measured."""
        chosen = self.in_keys_cells
        if not chosen.any():
            return self.bilinear
        cubic = self.prepared.keys_line.weights(self.pieces, chosen)
        rest = self.measured & ~chosen
        if not rest.any():
            return cubic
        plain = bilinear_weights(self.pieces, rest, self.grid)
        nodes = np.concatenate([cubic.nodes, plain.nodes])
        return NodeWeights.gathered(nodes, np.concatenate([cubic.values, plain.values]))

    def line(self, kind: str) -> NodeWeights:
        """Weights of the "bilinear" or "cubic" line."""
        return self.cubic if kind == "cubic" else self.bilinear

    # --- the area ----------------------------------------------------------------------------------

    @cached_property
    def area_pieces(self) -> AreaPieces:
        return area_pieces(self.pieces, self.grid, self.measured)

    @cached_property
    def rate_pieces(self) -> AreaPieces:
        """As `area_pieces`, own cells counted only where they have a vorticity."""
        if self.prepared.rate_area is self.prepared.measured_area:
            return self.area_pieces
        inside = np.flatnonzero(self.measured)
        chosen = np.zeros(self.measured.shape, bool)
        chosen[inside] = self.prepared.rate_cells[self.pieces.iy[inside], self.pieces.ix[inside]]
        return area_pieces(self.pieces, self.grid, chosen)

    @cached_property
    def area_share(self) -> float:
        """Measured share of the area."""
        if self.is_whole and self.prepared.has_no_gap:
            return 1.0
        return _share(self.prepared.measured_area.within(self.area_pieces), self.shape.area)

    @cached_property
    def rate_share(self) -> float:
        """Share of the area with a vorticity and divergence."""
        if self.prepared.rate_area is self.prepared.measured_area:
            return self.area_share
        return _share(self.prepared.rate_area.within(self.rate_pieces), self.shape.area)

    @cached_property
    def area(self) -> tuple[np.ndarray, tuple[int, int]]:
        """Weights of the node values in an integral over the area, on a block of nodes, and its corner."""
        return area_weights(self.area_pieces, self.grid)

    @cached_property
    def rates(self) -> NodeWeights:
        """Complex weights of (integral of vorticity, integral of divergence)."""
        return rate_weights(*self.area, self.prepared, self.corner_nodes.ravel())

    def block(self, values: np.ndarray) -> np.ndarray:
        """The part of node values (ny, nx) or (ny * nx,) that lies in the block of `area`."""
        weights, (top, left) = self.area
        rows, columns = weights.shape
        return values.reshape(self.grid.shape)[top : top + rows, left : left + columns]


def _share(part: float, whole: float) -> float:
    share = part / whole
    return 1.0 if share > 1 - _WHOLE else max(float(share), 0.0)


def percent(share: float) -> str:
    """A share in words: two significant digits."""
    return f"{100 * share:.2g} %"
