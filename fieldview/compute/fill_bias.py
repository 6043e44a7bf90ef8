"""How far a number may be off because some vectors under it were filled.

The random part of a filled vector is that of its sources and is followed exactly. What filling gets wrong
even without noise is read from the frame itself: the same gap with the same weights is punched into measured
surroundings nearby, where the truth is known to within noise.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from fieldview.compute.field import Field, Status
from fieldview.compute.filling import FillMap, fill_map
from fieldview.compute.node_weights import NodeWeights, carried_back
from fieldview.compute.pair_variance import pair_variance, through_variance

_PLACES = 16
"""Places looked at for each gap, the nearest ones."""

_FEWEST = 3
"""Places that must be found for each gap, else nothing is said."""

_MOST_GAPS = 400
"""Gaps looked at; of more an even choice stands for all."""


def _nearest_first(reach: int) -> np.ndarray:
    """Shifts (k, 2) up to this far along y and x, the nearest first."""
    steps = np.arange(-reach, reach + 1)
    shifts = np.stack(np.meshgrid(steps, steps, indexing="ij"), axis=-1).reshape(-1, 2)
    return shifts[np.argsort((shifts**2).sum(axis=1), kind="stable")][1:]


_SHIFTS = _nearest_first(12)
"""How gaps are moved to be punched again, along y and x. [nodes]"""


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
    chosen = gaps[:: -(-len(gaps) // _MOST_GAPS)]
    if all(field.grid.is_uniform) and change.method != "local_median":
        punched = [_moved(gap, change, field) for gap in chosen]
    else:
        punched = _filled_again(chosen, change, field)
    if min(map(len, punched)) < _FEWEST:
        return None
    scale = len(gaps) / len(chosen)
    scatter, means, total = np.zeros(2), [], 0.0
    for weights_by_place in punched:
        count = len(weights_by_place)
        errors = np.array([_error(part, field) for part in weights_by_place])
        total += errors.mean()
        off = _parts(errors - errors.mean())
        noise = _noise(weights_by_place[0], field)
        scatter += np.maximum((off**2).sum(axis=1) / (count - 1) - noise, 0.0)
        means.extend(part.times(1 / count) for part in weights_by_place)
    nodes = np.concatenate([part.nodes for part in means])
    together = NodeWeights.gathered(nodes, np.concatenate([part.values for part in means]))
    common = _parts(np.array([total]))[:, 0] ** 2 - _noise(together, field)
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


def _error(weights: NodeWeights, field: Field) -> complex | float:
    """The functional of the measured values."""
    measured = field.measured
    if np.iscomplexobj(weights.values):
        u, v = measured["u"].ravel()[weights.nodes], measured["v"].ravel()[weights.nodes]
        return complex((weights.values * (u - 1j * v)).sum())
    return weights.of(measured["w"].ravel())


def _moved(gap: NodeWeights, change: FillMap, field: Field) -> list[NodeWeights]:
    """Weights of a gap's error, filled less measured, at the nearest places that are wholly measured.

    On even axes a filling that does not look at the values has the same weights everywhere.
    """
    nx = field.grid.shape[1]
    rows = change.rows(gap.nodes)
    filling = NodeWeights.gathered(rows.indices, rows.data * np.repeat(gap.values, np.diff(rows.indptr)))
    error = filling - gap
    shifts = _SHIFTS[_on_measured(error.nodes, _SHIFTS, field)][:_PLACES]
    return [NodeWeights(error.nodes + dy * nx + dx, error.values) for dy, dx in shifts]


def _filled_again(gaps: list[NodeWeights], change: FillMap, field: Field) -> list[list[NodeWeights]]:
    """The same where weights depend on the place or the values: all gaps moved together and filled anew."""
    nx = field.grid.shape[1]
    found: list[list[NodeWeights]] = [[] for _ in gaps]
    measured = field.status == Status.MEASURED
    open_ = [_on_measured(gap.nodes, _SHIFTS[:_PLACES], field) for gap in gaps]
    for number, (dy, dx) in enumerate(_SHIFTS[:_PLACES]):
        step = dy * nx + dx
        able = [k for k in range(len(gaps)) if open_[k][number]]
        if not able:
            continue
        wanted = np.zeros(measured.size, bool)
        for k in able:
            wanted[gaps[k].nodes + step] = True
        wanted = wanted.reshape(measured.shape)
        again = fill_map(
            field.grid, measured & ~wanted, wanted, method=change.method, values=dict(field.measured)
        )
        for k in able:
            nodes = gaps[k].nodes + step
            if not again.filled.ravel()[nodes].all():
                continue
            rows = again.rows(nodes)
            spread = rows.data * np.repeat(gaps[k].values, np.diff(rows.indptr))
            found[k].append(NodeWeights.gathered(rows.indices, spread) - NodeWeights(nodes, gaps[k].values))
    return found


def _on_measured(nodes: np.ndarray, shifts: np.ndarray, field: Field) -> np.ndarray:
    """Which of the shifts (k, 2) along y and x put all nodes on measured ones: bool (k,)."""
    ny, nx = field.grid.shape
    rows, columns = np.divmod(nodes, nx)
    y, x = rows + shifts[:, :1], columns + shifts[:, 1:]
    inside = (y >= 0) & (y < ny) & (x >= 0) & (x < nx)
    there = field.status[np.clip(y, 0, ny - 1), np.clip(x, 0, nx - 1)] == Status.MEASURED
    return (inside & there).all(axis=1)
