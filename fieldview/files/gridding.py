"""From scattered rows to the lattice they were measured on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError

LEAST_SHARE = 0.25
"""Share of a lattice's nodes that must be there for it to be taken as the lattice of the rows."""


@dataclass(frozen=True, eq=False)
class Lattice:
    """Axes, and the node of every row.

    Attributes
    ----------
    x, y : ndarray (nx,), (ny,)
        Strictly increasing.
    node : int ndarray (n,) or None
        Flat index of the node of each kept row; None where the rows are the nodes in order ``[iy, ix]``.
    kept : ndarray or slice
        Which rows are kept.
    transposed : bool
        Rows run along y first; only where ``node`` is None.
    flip : (bool, bool)
        Axes x and y descend in the file; only where ``node`` is None.
    notes : tuple of str
    """

    x: np.ndarray
    y: np.ndarray
    node: np.ndarray | None
    kept: np.ndarray | slice
    transposed: bool = False
    flip: tuple[bool, bool] = (False, False)
    notes: tuple[str, ...] = ()

    @property
    def shape(self) -> tuple[int, int]:
        return self.y.size, self.x.size

    def spread(self, values: np.ndarray) -> np.ndarray:
        """Values of the rows on the nodes: ndarray (n,) -> (ny, nx), NaN where there is no row."""
        if self.node is not None:
            nodes = np.full(self.x.size * self.y.size, np.nan)
            nodes[self.node] = values[self.kept]
            return nodes.reshape(self.shape)
        nodes = values.reshape(self.shape[::-1]).T if self.transposed else values.reshape(self.shape)
        return nodes[:: -1 if self.flip[1] else 1, :: -1 if self.flip[0] else 1]


def lattice_of(x: np.ndarray, y: np.ndarray) -> Lattice:
    """The lattice behind rows with these coordinates, in any order.

    Coordinates closer than a small share of the spacing are one line. Rows without a position, off the
    lattice or on a node already taken are dropped and counted in ``notes``.

    Raises InputError where the rows do not lie on a lattice.
    """
    return _in_order(x, y) or _in_any_order(x, y)


def _in_order(x: np.ndarray, y: np.ndarray) -> Lattice | None:
    """The lattice of rows that run through it line by line: the usual case, without sorting."""
    for transposed, fast, slow in ((False, x, y), (True, y, x)):
        if fast.size < 2 or slow[0] == slow[-1] or fast[0] == fast[1]:
            continue
        length = int(np.argmax(slow != slow[0]))
        if length < 2 or fast.size % length:
            continue
        lines, runs = slow.reshape(-1, length), fast.reshape(-1, length)
        axis, other = runs[0], lines[:, 0]
        steps = (np.diff(axis), np.diff(other))
        if not all((s > 0).all() or (s < 0).all() for s in steps):
            continue
        if not ((lines == other[:, None]).all() and (runs == axis).all()):
            continue
        if any(_near_equal(line) for line in (axis, other)):
            return None
        flip_axis, flip_other = (bool(s[0] < 0) for s in steps)
        axis = axis[::-1] if flip_axis else axis
        other = other[::-1] if flip_other else other
        along, across, flip = (other, axis, (flip_other, flip_axis)) if transposed else (
            axis, other, (flip_axis, flip_other))  # fmt: skip
        return Lattice(along, across, None, slice(None), transposed, flip)
    return None


def _in_any_order(x: np.ndarray, y: np.ndarray) -> Lattice:
    notes = []
    placed = np.isfinite(x) & np.isfinite(y)
    kept = np.flatnonzero(placed)
    if kept.size < x.size:
        notes.append(
            _counted(x.size - kept.size, "row", "has no position and was dropped", "have no position")
        )
    if kept.size == 0:
        raise InputError("no row has a position")
    (lines_x, ix), (lines_y, iy) = _lines(x[kept]), _lines(y[kept])
    stray = _stray(lines_x, ix) | _stray(lines_y, iy)
    if stray.any() and not stray.all():
        notes.append(
            _counted(int(stray.sum()), "row", "lies off the grid and was dropped", "lie off the grid")
        )
        kept = kept[~stray]
        (lines_x, ix), (lines_y, iy) = _lines(x[kept]), _lines(y[kept])
    node = iy * lines_x.size + ix
    _, first = np.unique(node, return_index=True)
    if first.size < node.size:
        notes.append(
            _counted(
                node.size - first.size,
                "row",
                "repeats a node; the first one was kept",
                "repeat nodes; the first of each was kept",
            )
        )
        first.sort()
        kept, node = kept[first], node[first]
    share = node.size / (lines_x.size * lines_y.size)
    if share < LEAST_SHARE and min(lines_x.size, lines_y.size) > 1:
        raise InputError(
            f"the {node.size:,} positions do not lie on rows and columns (they would need {lines_x.size:,} x "
            f"{lines_y.size:,} nodes); dewarp or resample the measurement to a rectangular grid first"
        )
    return Lattice(lines_x, lines_y, node, kept, notes=tuple(notes))


def _lines(places: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The lines of one axis, strictly increasing, and the line of each place."""
    distinct, inverse = np.unique(places, return_inverse=True)
    if not _near_equal(distinct):
        return distinct, inverse
    steps = np.diff(distinct)
    number = np.concatenate([[0], np.cumsum(steps > _threshold(steps))])
    counts = np.bincount(number)
    sums = np.bincount(number, weights=distinct)
    lines = np.where(counts == 1, distinct[np.searchsorted(number, np.arange(counts.size))], sums / counts)
    return lines, number[inverse]


def _near_equal(distinct: np.ndarray) -> bool:
    """Whether some of the places are one line written with few digits."""
    steps = np.abs(np.diff(distinct))
    return steps.size > 1 and bool((steps <= _threshold(steps)).any())


def _threshold(steps: np.ndarray) -> float:
    """Steps up to this lie within a line: where sorted steps jump tenfold, far below the usual spacing.

    The steps of a stretched axis grow smoothly and have no such jump.
    """
    ordered = np.sort(steps)
    ratios = ordered[1:] / ordered[:-1]
    if ratios.size == 0:
        return 0.0
    jump = int(ratios.argmax())
    if ratios[jump] < 10 or ordered[jump] > 0.05 * np.median(ordered[jump + 1 :]):
        return 0.0
    return float(ordered[jump])


def _stray(lines: np.ndarray, line: np.ndarray) -> np.ndarray:
    """Rows alone on a line that stands between the lines of the lattice."""
    counts = np.bincount(line)
    if lines.size < 3 or np.median(counts) < 4:
        return np.zeros(line.size, bool)
    spacing = np.median(np.diff(lines[counts > 1])) if (counts > 1).sum() > 1 else np.inf
    beside = np.minimum(np.diff(lines, prepend=-np.inf), np.diff(lines, append=np.inf))
    return ((counts == 1) & (beside < 0.75 * spacing))[line]


def _counted(number: int, noun: str, one: str, many: str) -> str:
    if number == 1:
        return f"1 {noun} {one}"
    return f"{number:,} {noun}s {many}" + ("" if "kept" in many else " and were dropped")
