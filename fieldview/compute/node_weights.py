"""Linear functionals of a field's node values, kept at the few nodes where they have weight.

A pair of functionals of both components is one complex set of weights w = a + ib on the nodes:
sum of w conj(U), U = u + iv, whose real part is the sum of a u + b v and whose imaginary part that of
b u - a v. With the plane's steps as weights these are circulation and flux.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fieldview.compute.linear import LinearMap, MeanRemoval
from fieldview.compute.penalised import PenalisedMap
from fieldview.compute.smoothing import GaussianMap

_FEW = 0.01
"""Share of the nodes below which a smoothing is followed row by row and not as a whole."""


@dataclass(frozen=True, eq=False)
class NodeWeights:
    """Weights of a functional.

    Attributes
    ----------
    nodes : int ndarray (k,)
        Flat node numbers, increasing.
    values : float or complex ndarray (k,)
    """

    nodes: np.ndarray
    values: np.ndarray

    @classmethod
    def gathered(cls, nodes: np.ndarray, values: np.ndarray) -> NodeWeights:
        """Weights given in any order, those of one node added up.

        Parameters
        ----------
        nodes : int ndarray (n,)
        values : ndarray (n,)
        """
        if nodes.size == 0:
            return cls(np.zeros(0, np.int64), np.asarray(values))
        # one sort of whole numbers, the node in their upper and the entry in their lower digits
        digits = int(nodes.size).bit_length()
        keys = np.sort((np.asarray(nodes, np.int64) << digits) | np.arange(nodes.size))
        sorted_nodes = keys >> digits
        starts = np.concatenate([[0], np.flatnonzero(sorted_nodes[1:] != sorted_nodes[:-1]) + 1])
        sums = np.add.reduceat(values[keys & ((1 << digits) - 1)], starts)
        return cls(sorted_nodes[starts], sums)

    @classmethod
    def of_block(cls, block: np.ndarray, corner: tuple[int, int], nx: int) -> NodeWeights:
        """The weights of a rectangle of nodes (rows, columns) whose first node is ``corner``, zeros left out.

        What is round-off beside the largest weight counts as zero.
        """
        size = np.abs(block)
        rows, columns = np.nonzero(size > 1e-13 * size.max(initial=0.0))
        return cls((rows + corner[0]) * nx + columns + corner[1], block[rows, columns])

    def without_zeros(self) -> NodeWeights:
        """Without nodes whose weight is round-off beside the largest."""
        size = np.abs(self.values)
        keep = size > 1e-13 * size.max(initial=0.0)
        return self if keep.all() else NodeWeights(self.nodes[keep], self.values[keep])

    def __sub__(self, other: NodeWeights) -> NodeWeights:
        nodes = np.concatenate([self.nodes, other.nodes])
        return NodeWeights.gathered(nodes, np.concatenate([self.values, -other.values]))

    def times(self, factor) -> NodeWeights:
        return NodeWeights(self.nodes, self.values * factor)

    def of_pair(self, velocity: np.ndarray) -> complex:
        """Sum of w conj(U) for node velocities (ny * nx,), complex."""
        return complex((self.values * velocity[self.nodes].conj()).sum())

    def of(self, values: np.ndarray) -> float:
        """Sum of weights times node values (ny * nx,)."""
        return float((self.values * values[self.nodes]).sum())

    def dense(self, size: int) -> np.ndarray:
        whole = np.zeros(size, self.values.dtype)
        whole[self.nodes] = self.values
        return whole


def carried_back(
    weights: NodeWeights, maps: Sequence[LinearMap], size: int, *, plane: bool = True
) -> NodeWeights:
    """Weights on cleaned values as weights on the measured ones: through the transpose of every map.

    Parameters
    ----------
    weights : NodeWeights
    maps : sequence of LinearMap
        In the order they were applied.
    size : int
        Number of nodes of the grid.
    plane : bool
        Whether they are weights of u and v; a mean taken off does not concern w.
    """
    for change in reversed(maps):
        if isinstance(change, MeanRemoval):
            if plane:
                weights = _before_mean_removal(weights, change)
        elif isinstance(change, PenalisedMap) or (
            isinstance(change, GaussianMap) and weights.nodes.size > _FEW * size
        ):
            weights = _transposed(weights, change, size)
        else:
            rows = change.rows(weights.nodes)
            spread = np.repeat(weights.values, np.diff(rows.indptr))
            weights = NodeWeights.gathered(rows.indices, rows.data * spread)
    return weights


def _before_mean_removal(weights: NodeWeights, change: MeanRemoval) -> NodeWeights:
    total = weights.values.sum()
    if abs(total) <= 1e-12 * np.abs(weights.values).sum():
        return weights  # a closed contour does not feel a uniform velocity
    shared = np.flatnonzero(change.share)
    return weights - NodeWeights(shared, total * change.share[shared])


def _transposed(weights: NodeWeights, change: LinearMap, size: int) -> NodeWeights:
    whole = weights.dense(size)
    before = change.transpose(whole.real)
    if np.iscomplexobj(whole):
        before = before + 1j * change.transpose(whole.imag)
    nodes = np.flatnonzero(before)
    return NodeWeights(nodes, before[nodes])
