"""What cleaning did to the values, kept as linear maps so that uncertainty passes through exactly.

A map takes the node values of one component (flattened, row by row) to new node values. It is applied
alike to u, v and w. Weights of a linear functional travel the other way, through the transpose.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

import numpy as np

if TYPE_CHECKING:
    import scipy.sparse as sp


class LinearMap(Protocol):
    """Node values (n,) to node values (n,), linear."""

    exact: bool
    note: str

    def forward(self, values: np.ndarray) -> np.ndarray:
        """New node values (n,) or (n, k) of the values (n,) or (n, k)."""

    def transpose(self, weights: np.ndarray) -> np.ndarray:
        """Weights (n,) on the new values, carried back to weights (n,) on the old ones."""

    def rows(self, nodes: np.ndarray) -> sp.csr_array:
        """The rows of the map's matrix for these flat node numbers: (len(nodes), n)."""


@dataclass(frozen=True, eq=False)
class SparseMap:
    """A map given by its matrix.

    ``exact`` is False where the step was not linear and the matrix is only its local slope; ``note``
    then says so in words for the warnings.
    """

    matrix: sp.csr_array
    exact: bool = True
    note: str = ""

    def forward(self, values):
        return self.matrix @ values

    def transpose(self, weights):
        return self.matrix.T @ weights

    def rows(self, nodes):
        return self.matrix[nodes]


@dataclass(frozen=True, eq=False)
class MeanRemoval:
    """Subtraction of a weighted mean of the nodes from every node: values - share · values."""

    share: np.ndarray
    exact: bool = True
    note: str = ""

    def forward(self, values):
        return values - self.share @ values

    def transpose(self, weights):
        return weights - self.share * weights.sum()

    def rows(self, nodes):
        import scipy.sparse as sp

        eye = sp.csr_array(
            (np.ones(len(nodes)), (np.arange(len(nodes)), nodes)), shape=(len(nodes), self.share.size)
        )
        return sp.csr_array(eye - np.ones((len(nodes), 1)) * self.share[None, :])
