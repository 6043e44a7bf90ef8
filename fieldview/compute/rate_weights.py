"""Weights of the area integrals of vorticity and divergence: the derivative's transpose of area weights."""

from __future__ import annotations

import numpy as np

from fieldview.compute.derivatives import derivative_rows
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.prepared import Prepared

_CACHED_NODES = 32_768
"""Nodes worked on at a time."""

_NOTHING = 1e-12
"""Share of the largest weight that counts as round-off: coordinates far from 0 leave some 1e-13 of it."""


def rate_weights(
    area: np.ndarray, corner: tuple[int, int], prepared: Prepared, line_nodes: np.ndarray
) -> NodeWeights:
    """Complex weights whose pair is (integral of vorticity, integral of divergence).

    vorticity + i divergence = i (d/dx + i d/dy) conj(U), with the field's own scheme. In the plane
    d/dx + i d/dy is the placement's factor times the same of the lattice, d/dy reversed if mirrored.

    Parameters
    ----------
    area : ndarray (rows, columns)
        Weights of the integral over the area on a block of nodes. [length^2]
    corner : (int, int)
        Row and column of the block's first node.
    prepared : Prepared
    line_nodes : int ndarray (n,)
        Flat nodes at the corners of the cells through which the contour runs.
    """
    place = prepared.grid.placement
    factors = {"x": 1j * place.factor, "y": (1 if place.mirrored else -1) * place.factor}
    reach = max(rule.reach for rule, _ in prepared.stencils.values())
    scattered, masked = [], {}
    for along, (_, plain) in prepared.stencils.items():
        own = _block(plain, corner, area.shape)
        masked[along] = area if own.all() else np.where(own, area, 0.0)
        # outside the contour the weights are round-off, not zero
        rest = () if masked[along] is area else np.flatnonzero((np.abs(area) > _NOTHING * area.max()) & ~own)
        if len(rest):
            scattered.append(_of_rows(rest, area, corner, along, factors[along], prepared))
    if scattered or not _is_even(corner, area.shape, prepared):
        found = _transposed(masked, corner, prepared, reach)
    else:
        found = [_beside_line(area, corner, prepared, reach, line_nodes)]
    at = np.concatenate([nodes for nodes, _, _ in found])
    values = np.concatenate([factors["x"] * of_x + factors["y"] * of_y for _, of_x, of_y in found])
    rows, columns = np.divmod(at, area.shape[1] + 2 * reach)
    nodes = (rows + corner[0] - reach) * prepared.grid.shape[1] + columns + corner[1] - reach
    if not scattered:
        return NodeWeights(nodes, values)
    found = [(nodes, values), *scattered]
    return NodeWeights.gathered(*(np.concatenate(part) for part in zip(*found, strict=True)))


def _is_even(corner, shape, prepared: Prepared) -> bool:
    """Whether every weight of the stencils is the same at all nodes of the block."""
    blocks = (_block(weight, corner, shape) for weight in _weights_of(prepared))
    return all(np.ptp(block) <= _NOTHING * np.abs(block).max() for block in blocks)


def _beside_line(area, corner, prepared: Prepared, reach: int, line_nodes) -> tuple[np.ndarray, ...]:
    """As `_transposed`, on an even grid: where a stencil meets no cell of the contour, it meets an area whose
    weights are all the same or all zero, and its differences cancel."""
    framed = np.pad(area, 2 * reach)
    rows, columns = np.divmod(line_nodes, prepared.grid.shape[1])
    near = np.zeros((area.shape[0] + 2 * reach, area.shape[1] + 2 * reach), bool)
    rows, columns = rows - corner[0] + reach, columns - corner[1] + reach
    for rule, _ in prepared.stencils.values():
        for dy, dx in rule.offsets:
            near[rows + dy, columns + dx] = True
    nodes = np.flatnonzero(near)
    start = nodes // near.shape[1] * framed.shape[1] + nodes % near.shape[1]
    sums = []
    for rule, _ in prepared.stencils.values():
        total = np.zeros(nodes.size)
        for (dy, dx), weight in zip(rule.offsets, rule.weights, strict=True):
            constant = _block(weight, corner, area.shape).flat[0]
            if constant != 0:
                total += constant * framed.ravel()[start + (reach - dy) * framed.shape[1] + reach - dx]
        sums.append(total)
    return nodes, *sums


def _transposed(masked, corner, prepared: Prepared, reach: int) -> list[tuple[np.ndarray, ...]]:
    """(flat node of the framed block, weights along x and y) of the transposed stencils, some rows at a time.

    Well inside an even grid the differences cancel: few nodes are left.
    """
    rows, columns = masked["x"].shape
    largest = masked["x"].max() * max(np.abs(weight).max() for weight in _weights_of(prepared))
    wide, step = columns + 2 * reach, max(_CACHED_NODES // columns, 2 * reach + 1)
    found = []
    for first in range(0, rows + 2 * reach, step):
        last = min(first + step, rows + 2 * reach)
        parts = []
        for along, (rule, _) in prepared.stencils.items():
            total = np.zeros((last - first, wide))
            for (dy, dx), weight in zip(rule.offsets, rule.weights, strict=True):
                # rows of the area that this offset brings to the rows first ... last of the framed block
                top, bottom = max(first - reach - dy, 0), min(last - reach - dy, rows)
                if top < bottom and weight.any():
                    at = top + reach + dy - first
                    own = _block(weight, (corner[0] + top, corner[1]), (bottom - top, columns))
                    total[at : at + bottom - top, reach + dx : reach + dx + columns] += (
                        masked[along][top:bottom] * own
                    )
            parts.append(total.ravel())
        nodes = np.flatnonzero(np.abs(parts[0]) + np.abs(parts[1]) > _NOTHING * largest)
        found.append((nodes + first * wide, parts[0][nodes], parts[1][nodes]))
    return found


def _weights_of(prepared: Prepared):
    return [weight for rule, _ in prepared.stencils.values() for weight in rule.weights]


def _block(values: np.ndarray, corner: tuple[int, int], shape: tuple[int, int]) -> np.ndarray:
    """The block of an array of nodes, either of whose axes may have the length 1 and stand for all."""
    spans = [
        slice(first, first + count) if size > 1 else slice(None)
        for first, count, size in zip(corner, shape, values.shape, strict=True)
    ]
    return values[tuple(spans)]


def _of_rows(rest, area, corner, along, factor, prepared) -> tuple[np.ndarray, np.ndarray]:
    """Entries of the nodes that take another stencil, near edges and gaps: (nodes, weights)."""
    iy, ix = np.divmod(rest, area.shape[1])
    nodes = (iy + corner[0]) * prepared.grid.shape[1] + ix + corner[1]
    both = derivative_rows(prepared.grid, prepared.valid, scheme=prepared.field.derivative, nodes=nodes)
    rows = both[0 if along == "x" else 1]
    spread = np.repeat(area.ravel()[rest], np.diff(rows.indptr))
    return rows.indices, factor * rows.data * spread
