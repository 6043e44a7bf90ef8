"""Medians of stacks, and the local median as weights."""

from __future__ import annotations

import numpy as np

MAD_TO_SIGMA = 1.4826022185056018
"""1 / inverse normal distribution of 3/4: median absolute deviation to standard deviation."""


def column_median(stack: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Median over the first axis of what is finite: (median (...), number of finite samples (...)).

    The median is NaN where there are no samples.
    """
    ordered = np.sort(stack, axis=0)  # NaN goes last
    count = np.isfinite(stack).sum(axis=0)
    low = np.take_along_axis(ordered, np.maximum(count - 1, 0)[None] // 2, axis=0)[0]
    high = np.take_along_axis(ordered, np.minimum(count // 2, len(stack) - 1)[None], axis=0)[0]
    return 0.5 * (low + high), count


def median_weights(parts: list[np.ndarray], valid: np.ndarray, wanted: np.ndarray):
    """Weights (n, n), csr, of the local median at wanted nodes; rows out of reach are empty.

    The sources are the valid nodes of the smallest square around the node that holds at least three of
    them. For one component the weights pick the median; for several, the vector with the least sum of
    distances to the others, or the mean of several such.

    Source of the vector median: Astola, Haavisto & Neuvo (1990) Proc. IEEE 78:678-689 (from memory).
    """
    import scipy.sparse as sp

    ny, nx = valid.shape
    values = np.stack([np.where(valid, part, 0.0).ravel() for part in parts], axis=-1)
    rows, columns, weights = [], [], []
    left = np.flatnonzero(wanted)
    for radius in range(1, max(ny, nx)):
        if left.size == 0:
            break
        offsets = np.arange(-radius, radius + 1)
        jy = (left // nx)[:, None, None] + offsets[:, None]
        jx = (left % nx)[:, None, None] + offsets
        inside = ((jy >= 0) & (jy < ny) & (jx >= 0) & (jx < nx)).reshape(left.size, -1)
        flat = np.where(inside, (jy * nx + jx).reshape(left.size, -1), 0)
        sources = inside & valid.ravel()[flat]
        enough = sources.sum(axis=1) >= 3
        for node, members, is_source in zip(left[enough], flat[enough], sources[enough], strict=True):
            chosen = _vector_medians(values[members[is_source]])
            rows.append(np.full(chosen.size, node))
            columns.append(members[is_source][chosen])
            weights.append(np.full(chosen.size, 1.0 / chosen.size))
        left = left[~enough]
    if not rows:
        return sp.csr_array((valid.size, valid.size))
    entries = (np.concatenate(weights), (np.concatenate(rows), np.concatenate(columns)))
    return sp.csr_array(entries, shape=(valid.size, valid.size))


def _vector_medians(vectors: np.ndarray) -> np.ndarray:
    """Which of the vectors (k, components) have the least sum of distances to the others."""
    distances = np.sqrt(((vectors[:, None] - vectors[None]) ** 2).sum(axis=2)).sum(axis=1)
    least = distances.min()
    return np.flatnonzero(distances <= least * (1 + 1e-12))
