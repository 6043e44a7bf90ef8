"""The nodes within a closed contour, as spans of the rows of the lattice."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.block_extremes import BLOCK, BlockExtremes
from fieldview.compute.contour import Contour

_ON_LINE = 1e-9
"""Share of a cell within which the end of a piece counts as on a grid line."""


@dataclass(frozen=True, eq=False)
class Within:
    """Nodes within or on a contour that lies in the grid.

    Attributes
    ----------
    starts, stops : int ndarray (k,)
        Flat nodes of the spans, stops left out; increasing.
    singles : int ndarray (n,)
        Flat nodes on the contour itself; they may be in a span too.
    """

    starts: np.ndarray
    stops: np.ndarray
    singles: np.ndarray

    @property
    def nodes(self) -> np.ndarray:
        """All of them, flat and increasing."""
        spans = [np.arange(start, stop) for start, stop in zip(self.starts, self.stops, strict=True)]
        return np.unique(np.concatenate([*spans, self.singles]))

    def extremes(self, values: BlockExtremes) -> list[int] | None:
        """Flat nodes of the least and of the greatest value; None where there is no node."""
        if not self.starts.size and not self.singles.size:
            return None
        return [
            _furthest(values, side, self.starts, self.stops, self.singles)
            for side in (values.lowest, values.highest)
        ]


def _furthest(values: BlockExtremes, side: np.ndarray, starts, stops, singles) -> int:
    """Flat node whose value lies furthest to one side: that of the blocks' least or greatest values."""
    sign = 1.0 if side is values.highest else -1.0
    best, node = -np.inf, -1
    if singles.size:
        node = int(singles[np.argmax(sign * values.values[singles])])
        best = sign * values.values[node]
    first, last = -(-starts // BLOCK), stops // BLOCK
    whole = first < last
    if whole.any():
        ends = np.ravel(np.column_stack([first[whole], last[whole]]))
        rule = np.maximum if sign > 0 else np.minimum
        # what lies between two spans is reduced too, and not looked at
        held = rule.reduceat(side, ends[:-1] if ends[-1] == side.size else ends)[::2]
        most = int(np.argmax(sign * held))
        if sign * held[most] > best:
            blocks = slice(first[whole][most] * BLOCK, last[whole][most] * BLOCK)
            node = int(blocks.start + np.argmax(sign * values.values[blocks]))
            best = sign * values.values[node]
    # of the blocks cut by the ends of the spans only those that could hold more
    cut = np.concatenate([starts // BLOCK, (stops - 1) // BLOCK])
    for at in np.flatnonzero(sign * side[cut] > best):
        span = at % starts.size
        start = max(starts[span], cut[at] * BLOCK)
        part = sign * values.values[start : min(stops[span], (cut[at] + 1) * BLOCK)]
        most = int(np.argmax(part))
        if part[most] > best:
            best, node = part[most], int(start + most)
    return node


def within(contour: Contour) -> Within:
    """The nodes within or on a closed contour that lies in the grid.

    Every crossing of a row of nodes turns the inside on or off for the nodes to the right of it: half a turn
    for either of the pieces that meet there.
    """
    nx = contour.grid.shape[1]
    pieces = contour.pieces
    ends = [(pieces.a + side * pieces.da, pieces.b + side * pieces.db) for side in (-0.5, 0.5)]
    on_row = [np.abs(b - np.round(b)) < _ON_LINE for _, b in ends]
    along = on_row[0] & on_row[1] & (np.abs(pieces.db) < 0.5)  # neither of its ends crosses the row
    keys, turns, singles = [], [], []
    stride = nx + 1  # a crossing may be to the right of all nodes
    for (a, b), on in zip(ends, on_row, strict=True):
        at = np.flatnonzero(on & ~along)
        row = pieces.iy[at] + np.round(b[at]).astype(int)
        keys.append(row * stride + pieces.ix[at] + (a[at] > _ON_LINE))
        turns.append(np.sign(pieces.db[at]))
        at = np.flatnonzero(on & (np.abs(a - np.round(a)) < _ON_LINE))
        row, column = (np.round(part[at]).astype(int) for part in (b, a))
        singles.append((pieces.iy[at] + row) * nx + pieces.ix[at] + column)
    key = np.concatenate(keys)
    order = np.argsort(key)
    row, column = np.divmod(key[order], stride)
    inside = np.cumsum(np.concatenate(turns)[order])[:-1] != 0
    starts, stops = row[:-1] * nx + column[:-1], row[:-1] * nx + column[1:]
    kept = inside & (row[1:] == row[:-1]) & (stops > starts)
    return Within(starts[kept], stops[kept], np.unique(np.concatenate(singles)))
