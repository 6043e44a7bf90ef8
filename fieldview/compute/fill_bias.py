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
from fieldview.compute.node_weights import NodeWeights, carried_back
from fieldview.compute.pair_variance import pair_variance, through_variance

_PLACES = 16
"""Places looked at for each gap, the nearest ones."""

_TRIED_FIRST = 80
"""Shifts tried before the far ones, which are seldom needed."""

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


@dataclass(frozen=True, eq=False)
class _Punched:
    """One gap at all places it was punched into.

    Attributes
    ----------
    nodes, values : ndarray (n,)
        Weights of its error, filled less measured, at all places one after the other.
    errors : ndarray (k,)
        Its error at every place.
    nearest : NodeWeights
        The weights at the first place.
    """

    nodes: np.ndarray
    values: np.ndarray
    errors: np.ndarray
    nearest: NodeWeights


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
        punched = _moved(chosen, change, field)
    else:
        punched = _filled_again(chosen, change, field)
    if punched is None:
        return None
    scale = len(gaps) / len(chosen)
    scatter, total = np.zeros(2), 0.0
    for gap in punched:
        total += gap.errors.mean()
        off = _parts(gap.errors - gap.errors.mean())
        variance = (off**2).sum(axis=1) / (gap.errors.size - 1)
        scatter += np.maximum(variance - _noise(gap.nearest, field), 0.0)
    nodes = np.concatenate([gap.nodes for gap in punched])
    values = np.concatenate([gap.values / gap.errors.size for gap in punched])
    common = _parts(np.array([total]))[:, 0] ** 2 - _noise(NodeWeights.gathered(nodes, values), field)
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


def _measured(nodes: np.ndarray, field: Field, *, pair: bool) -> np.ndarray:
    """Measured values at some nodes: conj(u + iv) for a pair of functionals, else w."""
    if pair:
        u, v = (field.measured[name].ravel()[nodes] for name in ("u", "v"))
        return u - 1j * v
    return field.measured["w"].ravel()[nodes]


def _moved(gaps: list[NodeWeights], change: FillMap, field: Field) -> list[_Punched] | None:
    """Every gap at the nearest places that are wholly measured; None where one has too few.

    On even axes a filling that does not look at the values has the same weights everywhere.
    """
    nx = field.grid.shape[1]
    rows = change.rows(np.concatenate([gap.nodes for gap in gaps]))
    found, row = [], 0
    for gap in gaps:
        sources = slice(*rows.indptr[[row, row + gap.nodes.size]])
        per_node = np.diff(rows.indptr[row : row + gap.nodes.size + 1])
        row += gap.nodes.size
        spread = rows.data[sources] * np.repeat(gap.values, per_node)
        nodes = np.concatenate([rows.indices[sources], gap.nodes])
        error = NodeWeights.gathered(nodes, np.concatenate([spread, -gap.values]))
        shifts = _places(error.nodes, field)
        if len(shifts) < _FEWEST:
            return None
        places = error.nodes + (shifts @ [nx, 1])[:, None]
        truth = _measured(places, field, pair=np.iscomplexobj(error.values))
        found.append(
            _Punched(
                places.ravel(),
                np.tile(error.values, len(shifts)),
                truth @ error.values,
                NodeWeights(places[0], error.values),
            )
        )
    return found


def _places(nodes: np.ndarray, field: Field) -> np.ndarray:
    """The shifts (k, 2) that put all nodes on measured ones, the nearest few."""
    near = _SHIFTS[:_TRIED_FIRST]
    near = near[_on_measured(nodes, near, field)]
    if len(near) < _PLACES:
        far = _SHIFTS[_TRIED_FIRST:]
        near = np.concatenate([near, far[_on_measured(nodes, far, field)]])
    return near[:_PLACES]


def _filled_again(gaps: list[NodeWeights], change: FillMap, field: Field) -> list[_Punched] | None:
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
    if min(map(len, found)) < _FEWEST:
        return None
    return [_together(places, field) for places in found]


def _together(places: list[NodeWeights], field: Field) -> _Punched:
    nodes, values = (np.concatenate([getattr(at, name) for at in places]) for name in ("nodes", "values"))
    starts = np.cumsum([0, *(at.nodes.size for at in places[:-1])])
    errors = np.add.reduceat(values * _measured(nodes, field, pair=np.iscomplexobj(values)), starts)
    return _Punched(nodes, values, errors, places[0])


def _on_measured(nodes: np.ndarray, shifts: np.ndarray, field: Field) -> np.ndarray:
    """Which of the shifts (k, 2) along y and x put all nodes on measured ones: bool (k,)."""
    ny, nx = field.grid.shape
    rows, columns = np.divmod(nodes, nx)
    y, x = rows + shifts[:, :1], columns + shifts[:, 1:]
    inside = (y >= 0) & (y < ny) & (x >= 0) & (x < nx)
    there = field.status[np.clip(y, 0, ny - 1), np.clip(x, 0, nx - 1)] == Status.MEASURED
    return (inside & there).all(axis=1)
