"""Variances of linear functionals of one component's node values under the error model.

C_ij = sigma_i sigma_j rho(i - j), rho a separable triangle: max(0, 1 - |k|/m) along each axis.
"""

from __future__ import annotations

import math

import numpy as np
import scipy.sparse as sp


def row_variances(rows: sp.csr_array, sigma: np.ndarray, correlation: tuple[float, float]) -> np.ndarray:
    """Variance of each of many functionals, given as sparse rows.

    Parameters
    ----------
    rows : csr_array (k, ny * nx)
        Weights on the node values.
    sigma : ndarray (ny, nx)
        Standard uncertainty of each value.
    correlation : (float, float)
        Nodes along x and y over which errors are correlated.

    Returns
    -------
    ndarray (k,)
    """
    weighted = sp.csr_array(rows, copy=True)
    weighted.data = weighted.data * sigma.ravel()[weighted.indices]
    if max(correlation) <= 1:
        image = weighted
    else:
        used, compact = np.unique(weighted.indices, return_inverse=True)
        entries = (weighted.data, compact.ravel(), weighted.indptr)
        weighted = sp.csr_array(entries, shape=(rows.shape[0], used.size))
        image = weighted @ _coefficients_among(used, sigma.shape, correlation)
    return np.asarray((image * weighted).sum(axis=1)).ravel()


def functional_variance(weights: np.ndarray, sigma: np.ndarray, correlation: tuple[float, float]) -> float:
    """Variance of the functional with these weights (ny, nx)."""
    return functional_covariance(weights, weights, sigma, correlation)


def functional_covariance(
    a: np.ndarray, b: np.ndarray, sigma: np.ndarray, correlation: tuple[float, float]
) -> float:
    """Covariance of two functionals with weights a and b (ny, nx)."""
    from scipy.ndimage import correlate1d

    image = b * sigma
    for axis, nodes in ((0, correlation[1]), (1, correlation[0])):
        if nodes > 1:
            image = correlate1d(image, triangle(nodes), axis=axis, mode="constant")
    return float((a * sigma * image).sum())


def triangle(nodes: float) -> np.ndarray:
    """Correlation coefficients at the lags -r ... r that are within reach: ndarray (2r + 1,)."""
    reach = max(math.ceil(nodes) - 1, 0)
    return 1 - np.abs(np.arange(-reach, reach + 1)) / max(nodes, 1.0)


def _coefficients_among(used: np.ndarray, shape: tuple[int, int], correlation) -> sp.csr_array:
    """Correlation coefficients between these flat nodes (sorted), csr (len(used), len(used))."""
    ny, nx = shape
    number = np.full(ny * nx, -1)
    number[used] = np.arange(used.size)
    iy, ix = np.divmod(used, nx)
    rows, columns, values = [], [], []
    along_x, along_y = triangle(correlation[0]), triangle(correlation[1])
    for j, of_y in enumerate(along_y, start=-(along_y.size // 2)):
        for i, of_x in enumerate(along_x, start=-(along_x.size // 2)):
            inside = np.flatnonzero((iy + j >= 0) & (iy + j < ny) & (ix + i >= 0) & (ix + i < nx))
            other = number[used[inside] + j * nx + i]
            there = other >= 0
            rows.append(inside[there])
            columns.append(other[there])
            values.append(np.full(np.count_nonzero(there), of_x * of_y))
    entries = (np.concatenate(values), (np.concatenate(rows), np.concatenate(columns)))
    return sp.csr_array(entries, shape=(used.size, used.size))
