"""Weights of the area integrals of vorticity and divergence: the derivative's transpose of area weights."""

from __future__ import annotations

import numpy as np

from fieldview.compute.derivatives import derivative_rows
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.prepared import Prepared


def rate_weights(area: np.ndarray, corner: tuple[int, int], prepared: Prepared) -> NodeWeights:
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
    """
    place = prepared.grid.placement
    factors = {"x": 1j * place.factor, "y": (1 if place.mirrored else -1) * place.factor}
    # outside the contour the weights are round-off, not zero
    area = np.where(np.abs(area) > 1e-13 * np.abs(area).max(), area, 0.0)
    reach = max(rule.reach for rule, _ in prepared.stencils.values())
    block = np.zeros((area.shape[0] + 2 * reach, area.shape[1] + 2 * reach), complex)
    parts = {"x": np.zeros(block.shape), "y": np.zeros(block.shape)}
    scattered = []
    for along, (rule, plain) in prepared.stencils.items():
        own = _block(plain, corner, area.shape)
        _add_stencil(parts[along], np.where(own, area, 0.0), corner, rule, reach)
        rest = np.flatnonzero((area != 0) & ~own)
        if rest.size:
            scattered.append(_of_rows(rest, area, corner, along, factors[along], prepared))
    for along, part in parts.items():
        block += factors[along] * part
    nodes, values = _inside(block, (corner[0] - reach, corner[1] - reach), prepared.grid.shape)
    if not scattered:
        return NodeWeights(nodes, values)
    found = [(nodes, values), *scattered]
    return NodeWeights.gathered(*(np.concatenate(part) for part in zip(*found, strict=True)))


def _add_stencil(total, area, corner, rule, reach) -> None:
    """Add the transpose of the stencil times area weights."""
    rows, columns = area.shape
    for (dy, dx), weight in zip(rule.offsets, rule.weights, strict=True):
        if weight.any():
            target = total[reach + dy : reach + dy + rows, reach + dx : reach + dx + columns]
            target += area * _block(weight, corner, area.shape)


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


def _inside(block, corner, shape) -> tuple[np.ndarray, np.ndarray]:
    """Nodes and weights of a block that are not zero; nothing of it stands outside the grid."""
    size = np.abs(block.real) + np.abs(block.imag)
    rows, columns = np.nonzero(size > 1e-13 * size.max())
    return (rows + corner[0]) * shape[1] + columns + corner[1], block[rows, columns]
