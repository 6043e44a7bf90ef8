"""How far a number may be off because some vectors under it were filled.

The random part of a filled vector is that of its sources and is followed exactly. What filling gets wrong
even without noise is read from the frame itself: the same gap with the same weights is punched into measured
surroundings nearby, where the truth is known to within noise.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from fieldview.compute.field import Field, Status
from fieldview.compute.filling import FillMap, fill_map
from fieldview.compute.grid import Grid
from fieldview.compute.node_weights import NodeWeights, carried_back
from fieldview.compute.pair_variance import pair_variance, through_variance

_REACH = 12
"""How far gaps are moved to be punched again. [nodes]"""

_PLACES = 16
"""Places looked at for each gap, the nearest ones."""

_FEWEST = 3
"""Places that must be found for each gap, else nothing is said."""

_MOST_GAPS = 400
"""Gaps looked at; of more an even choice stands for all."""


@dataclass(frozen=True, eq=False)
class _Punched:
    """A gap's errors at the places where it was punched: weights times (filled less measured)."""

    errors: np.ndarray  # (places,)
    weights: list[NodeWeights]  # of those errors on the measured values, place by place


def fill_uncertainty(weights: NodeWeights, field: Field) -> complex | float | None:
    """Standard uncertainty from the bias of the filled vectors that carry weight.

    The mean error of all gaps together counts as a whole, since gaps in like surroundings err alike; the
    scatter from place to place counts gap by gap. Of both the noise is taken off.

    Parameters
    ----------
    weights : NodeWeights
        On the field's values: complex for a pair of functionals of u and v, real for one of w.
    field : Field

    Returns
    -------
    complex (first and second number of the pair), float, or None
        None where a gap has too few measured places around to be punched into.
    """
    pair = np.iscomplexobj(weights.values)
    total = np.zeros(2)
    for number, change in enumerate(field.maps):
        if isinstance(change, FillMap):
            later = field.maps[number + 1 :]
            part = _of_map(carried_back(weights, later, field.status.size, plane=pair), change, field)
            if part is None:
                return None
            total += part
    spread = np.sqrt(total)
    return complex(*spread) if pair else float(spread[0])


def _of_map(weights: NodeWeights, change: FillMap, field: Field) -> np.ndarray | None:
    """Variances (2,) from the gaps of one filling."""
    weights = weights.without_zeros()
    chosen = change.filled.ravel()[weights.nodes]
    filled = NodeWeights(weights.nodes[chosen], weights.values[chosen])
    if filled.nodes.size == 0:
        return np.zeros(2)
    gaps = list(_gaps(filled, field.grid.shape[1]))
    step = -(-len(gaps) // _MOST_GAPS)
    scale = len(gaps) / len(gaps[::step])
    scatter, means, errors = np.zeros(2), [], 0.0
    for gap in gaps[::step]:
        punched = _punched(gap, change, field)
        if punched.errors.size < _FEWEST:
            return None
        count = punched.errors.size
        mean = punched.errors.mean()
        errors += mean
        off = _parts(punched.errors - mean)
        scatter += np.maximum((off**2).sum(axis=1) / (count - 1) - _noise(punched.weights[0], field), 0.0)
        means.extend(part.times(1 / count) for part in punched.weights)
    nodes = np.concatenate([part.nodes for part in means])
    together = NodeWeights.gathered(nodes, np.concatenate([part.values for part in means]))
    common = _parts(np.array([errors]))[:, 0] ** 2 - _noise(together, field)
    return scale**2 * np.maximum(common, 0.0) + scale * scatter


def _parts(values: np.ndarray) -> np.ndarray:
    return np.stack([values.real, values.imag])


def _noise(weights: NodeWeights, field: Field) -> np.ndarray:
    """Variances (2,) of functionals of the measured values, 0 where sigma is not known."""
    if np.iscomplexobj(weights.values):
        found = pair_variance(weights, field, measured=True)
        return np.zeros(2) if found is None else np.array([found.first, found.second])
    return np.array([through_variance(weights, field, measured=True) or 0.0, 0.0])


def _gaps(filled: NodeWeights, nx: int) -> Iterator[NodeWeights]:
    """The filled nodes, one connected set after the other."""
    from scipy.ndimage import label

    rows, columns = np.divmod(filled.nodes, nx)
    top, left = rows.min(), columns.min()
    block = np.zeros((rows.max() - top + 1, columns.max() - left + 1), bool)
    block[rows - top, columns - left] = True
    number = label(block)[0][rows - top, columns - left]
    order = np.argsort(number, kind="stable")
    for members in np.split(order, np.flatnonzero(np.diff(number[order])) + 1):
        yield NodeWeights(filled.nodes[members], filled.values[members])


def _punched(gap: NodeWeights, change: FillMap, field: Field) -> _Punched:
    """The gap at the nearest places where it and its sources are all measured."""
    nx = field.grid.shape[1]
    rows = change.rows(gap.nodes)
    filling = NodeWeights.gathered(rows.indices, rows.data * np.repeat(gap.values, np.diff(rows.indptr)))
    error = filling - gap
    shifts = _shifts(error.nodes, field)
    by_shift = all(field.grid.is_uniform) and change.method != "local_median"
    weights = []
    for dy, dx in shifts:
        moved = NodeWeights(error.nodes + dy * nx + dx, error.values)
        if not by_shift:
            again = _filled_again(NodeWeights(gap.nodes + dy * nx + dx, gap.values), moved, change, field)
            if again is None:
                continue
            moved = again
        weights.append(moved)
    if np.iscomplexobj(gap.values):
        u, v = field.measured["u"].ravel(), field.measured["v"].ravel()
        errors = [(part.values * (u[part.nodes] - 1j * v[part.nodes])).sum() for part in weights]
    else:
        w = field.measured["w"].ravel()
        errors = [part.of(w) for part in weights]
    return _Punched(np.array(errors), weights)


def _shifts(nodes: np.ndarray, field: Field) -> np.ndarray:
    """Shifts (k, 2) along y and x, nearest first, that put all nodes on measured ones."""
    ny, nx = field.grid.shape
    steps = np.arange(-_REACH, _REACH + 1)
    shifts = np.stack(np.meshgrid(steps, steps, indexing="ij"), axis=-1).reshape(-1, 2)
    distance = (shifts**2).sum(axis=1)
    shifts = shifts[np.argsort(distance, kind="stable")][1:]
    rows, columns = np.divmod(nodes, nx)
    y, x = rows + shifts[:, :1], columns + shifts[:, 1:]
    inside = (y >= 0) & (y < ny) & (x >= 0) & (x < nx)
    there = field.status[np.clip(y, 0, ny - 1), np.clip(x, 0, nx - 1)] == Status.MEASURED
    return shifts[(inside & there).all(axis=1)][:_PLACES]


def _filled_again(gap: NodeWeights, sources: NodeWeights, change: FillMap, field: Field):
    """The punched gap filled by the same method anew, where its weights depend on the place or the values."""
    ny, nx = field.grid.shape
    rows, columns = np.divmod(sources.nodes, nx)
    y = slice(max(rows.min() - 2, 0), min(rows.max() + 3, ny))
    x = slice(max(columns.min() - 2, 0), min(columns.max() + 3, nx))
    block = Grid(field.grid.x[x], field.grid.y[y])
    wanted = np.zeros(block.shape, bool)
    gap_rows, gap_columns = gap.nodes // nx - y.start, gap.nodes % nx - x.start
    wanted[gap_rows, gap_columns] = True
    valid = (field.status[y, x] == Status.MEASURED) & ~wanted
    values = {name: field.measured[name][y, x] for name in field.components}
    again = fill_map(block, valid, wanted, method=change.method, values=values)
    if not again.filled[wanted].all():
        return None
    found = again.rows(gap_rows * block.shape[1] + gap_columns)
    iy, ix = np.divmod(found.indices, block.shape[1])
    spread = found.data * np.repeat(gap.values, np.diff(found.indptr))
    return NodeWeights.gathered((iy + y.start) * nx + ix + x.start, spread) - gap
