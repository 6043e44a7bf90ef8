"""Variance of linear functionals of a cleaned component, carried back through filling and smoothing."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import scipy.sparse as sp

from fieldview.compute.covariance import row_variances
from fieldview.compute.linear import LinearMap, MeanRemoval, SparseMap
from fieldview.compute.penalised import PenalisedMap
from fieldview.compute.stencil_covariance import coefficient


def changed_nodes(maps: Sequence[LinearMap], shape: tuple[int, int]) -> np.ndarray:
    """Nodes, bool (ny, nx), whose value is not the measured one any more; a mean taken off does not count."""
    changed = np.zeros(shape[0] * shape[1], bool)
    for change in maps:
        if isinstance(change, SparseMap):
            matrix = change.matrix
            changed |= (np.diff(matrix.indptr) != 1) | (matrix.diagonal() != 1)
        elif not isinstance(change, MeanRemoval):
            changed[:] = True
    return changed.reshape(shape)


def _before(rows, change: LinearMap):
    """Weights on the values before a map, of rows of weights on those after it; sparse or dense."""
    if isinstance(change, MeanRemoval):
        return rows
    if isinstance(change, SparseMap | PenalisedMap):
        return rows @ change.matrix
    if isinstance(rows, np.ndarray):
        return change.transpose(rows.T).T
    used, compact = np.unique(rows.indices, return_inverse=True)
    entries = (rows.data, compact.ravel(), rows.indptr)
    return sp.csr_array(entries, shape=(rows.shape[0], used.size)) @ change.rows(used)


class Passage:
    """The way from the measured values of one component to the cleaned ones.

    Parameters
    ----------
    maps : sequence of LinearMap
        In the order they were applied.
    sigma : ndarray (ny, nx)
        Standard uncertainty of the measured values.
    correlation : (float, float)
        Nodes along x and y over which errors are correlated.
    """

    def __init__(self, maps: Sequence[LinearMap], sigma: np.ndarray, correlation: tuple[float, float]):
        self.maps, self.sigma, self.correlation = tuple(maps), sigma, correlation

    def variances(self, rows: sp.csr_array) -> np.ndarray:
        """Variance (k,) of the functionals whose weights on the cleaned values are the rows (k, ny * nx)."""
        # a mean taken off would fill every row: it is kept aside, as a factor per row times common weights
        asides: list[tuple[np.ndarray, np.ndarray]] = []
        for change in reversed(self.maps):
            asides = [(factor, change.transpose(common)) for factor, common in asides]
            if isinstance(change, MeanRemoval):
                factor = -np.asarray(rows.sum(axis=1)).ravel()
                if np.abs(factor).max(initial=0.0) > 1e-9 * np.abs(rows).max():
                    asides.append((factor, change.share))
            rows = _before(rows, change)
        if isinstance(rows, np.ndarray):
            variance = self._dense_variances(rows)
        else:
            variance = row_variances(sp.csr_array(rows), self.sigma, self.correlation)
        return variance + self._with_asides(rows, asides)

    def correction_of_plain_values(self) -> np.ndarray:
        """What means taken off add to the variance of values that no map has changed: (ny, nx)."""
        asides = []
        for change in reversed(self.maps):
            asides = [(factor, change.transpose(common)) for factor, common in asides]
            if isinstance(change, MeanRemoval):
                asides.append((-1.0, change.share))
        shape = self.sigma.shape
        return np.broadcast_to(self._with_asides(None, asides), shape[0] * shape[1]).reshape(shape)

    def _with_asides(self, rows, asides) -> np.ndarray | float:
        """Twice the covariance of the rows with what was kept aside, and the variance of that."""
        total = 0.0
        images = [self._correlated(common) for _, common in asides]
        for (factor, _), image in zip(asides, images, strict=True):
            total = total + 2 * factor * (image if rows is None else rows @ image)
            total = total + sum(factor * other * (common @ image) for other, common in asides)
        return total

    def _correlated(self, weights: np.ndarray) -> np.ndarray:
        """The covariance matrix of the measured values times weights (n,)."""
        along_y, along_x = self._coefficients()
        weighted = self.sigma * weights.reshape(self.sigma.shape)
        return (self.sigma * (along_y @ weighted @ along_x)).ravel()

    def _dense_variances(self, rows: np.ndarray) -> np.ndarray:
        along_y, along_x = self._coefficients()
        weighted = rows.reshape(-1, *self.sigma.shape) * self.sigma
        return (weighted * (along_y @ weighted @ along_x)).sum(axis=(1, 2))

    def _coefficients(self):
        """Correlation coefficients along y (ny, ny) and along x (nx, nx), sparse where the grid is large."""
        matrices = []
        for size, nodes in zip(self.sigma.shape, self.correlation[::-1], strict=True):
            lag = np.arange(size)[:, None] - np.arange(size)
            matrices.append(coefficient((lag, 0), (1.0, nodes)))
        return matrices
