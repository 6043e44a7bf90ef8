"""Medians over neighbours, fast: comparator networks over shifted planes, block by block in the cache."""

from __future__ import annotations

from functools import cache

import numpy as np

MAD_TO_SIGMA = 1.4826022185056018
"""1 / inverse normal distribution of 3/4: median absolute deviation to standard deviation."""

_BLOCK_NODES = 32_000
"""Nodes worked on at a time with 8 neighbours: all their planes stay in the second-level cache."""

_LARGEST_NETWORK = 48
"""Neighbours up to which a comparator network beats a partial sort of every node's own list."""


def column_median(stack: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Median over the first axis of what is finite: (median (...), number of finite samples (...)).

    The median is NaN where there are no samples.
    """
    ordered = np.sort(stack, axis=0)  # NaN goes last
    count = np.isfinite(stack).sum(axis=0)
    low = np.take_along_axis(ordered, np.maximum(count - 1, 0)[None] // 2, axis=0)[0]
    high = np.take_along_axis(ordered, np.minimum(count // 2, len(stack) - 1)[None], axis=0)[0]
    return 0.5 * (low + high), count


def neighbour_residual(
    parts: list[np.ndarray], usable: np.ndarray, radius: int, floors: list[float]
) -> tuple[np.ndarray, np.ndarray]:
    """Normalised median residual, largest over the components, and number of usable neighbours.

    Parameters
    ----------
    parts : list of ndarray (ny, nx)
        Components; values where ``usable`` is False are not looked at.
    usable : bool ndarray (ny, nx)
    radius : int
    floors : list of float
        One for each component.

    Returns
    -------
    residual : ndarray (ny, nx)
        Of no meaning where there are no neighbours.
    neighbours : ndarray (ny, nx) of int
    """
    ny, nx = usable.shape
    side = 2 * radius + 1
    shifts = [(dy, dx) for dy in range(side) for dx in range(side) if (dy, dx) != (radius, radius)]
    framed = np.pad(usable, radius)
    bordered = [np.pad(np.where(usable, part, 0.0), radius) for part in parts]
    residual = np.empty((ny, nx))
    neighbours = np.empty((ny, nx), np.int16)
    rows = max(1, _BLOCK_NODES * 8 // (len(shifts) * (nx + 2 * radius)))
    for top in range(0, ny, rows):
        block = slice(top, min(top + rows, ny))
        windows = [(slice(top + dy, block.stop + dy), slice(dx, dx + nx)) for dy, dx in shifts]
        pads, neighbours[block] = _balanced_pads(framed, windows)
        odd = (neighbours[block] & 1).astype(bool)
        for number, (part, floor) in enumerate(zip(bordered, floors, strict=True)):
            planes = [part[window] for window in windows]
            middle = _median(planes, pads, odd)
            distances = [np.abs(plane - middle) for plane in planes]
            spread = _median(distances, pads, odd)
            centre = part[block.start + radius : block.stop + radius, radius : radius + nx]
            ratio = _ratio(np.abs(centre - middle), spread + floor)
            residual[block] = ratio if number == 0 else np.maximum(residual[block], ratio)
    return residual, neighbours


def _balanced_pads(framed: np.ndarray, windows) -> tuple[list[np.ndarray], np.ndarray]:
    """What to add to each neighbour so that those not usable drop out of the median, and the usable count.

    The unusable ones become +inf and -inf in turn (+inf first): with an even number of them the median of
    the rest is still the mean of the two middle values, with an odd number it is the lower of the two.
    """
    up = np.ones(framed[windows[0]].shape, bool)
    count = np.zeros(up.shape, np.int16)
    pads = []
    for window in windows:
        usable = framed[window]
        count += usable
        pad = np.where(up, np.inf, -np.inf)
        pad[usable] = 0.0
        pads.append(pad)
        up ^= ~usable
    return pads, count


def _median(planes, pads, odd) -> np.ndarray:
    """Median over the planes, those padded to infinity left out."""
    work = [plane + pad for plane, pad in zip(planes, pads, strict=True)]
    half = len(work) // 2
    if len(work) <= _LARGEST_NETWORK:
        low, high = _middle_two(work)
    else:
        ordered = np.partition(np.stack(work, axis=-1), (half - 1, half), axis=-1)
        low, high = ordered[..., half - 1], ordered[..., half]
    with np.errstate(invalid="ignore"):
        return np.where(odd, low, 0.5 * (low + high))


def _middle_two(work: list[np.ndarray]) -> tuple[np.ndarray, np.ndarray]:
    """The two middle values of an even number of planes; the planes are used up."""
    spare = np.empty_like(work[0])
    for a, b, need_low, need_high in _middle_network(len(work)):
        if need_low and need_high:
            np.minimum(work[a], work[b], out=spare)
            np.maximum(work[a], work[b], out=work[b])
            work[a], spare = spare, work[a]
        elif need_low:
            np.minimum(work[a], work[b], out=work[a])
        else:
            np.maximum(work[a], work[b], out=work[b])
    return work[len(work) // 2 - 1], work[len(work) // 2]


@cache
def _middle_network(count: int) -> tuple[tuple[int, int, bool, bool], ...]:
    """Comparators (a, b, lower needed, higher needed) that bring the two middle values into place.

    Batcher's odd-even merge sort (1968, AFIPS Spring Joint Computer Conf. 32:307-314), without the
    comparators that the middle does not depend on.
    """
    wanted = {count // 2 - 1, count // 2}
    kept = []
    for a, b in reversed(_sorting_network(count)):
        if a in wanted or b in wanted:
            kept.append((a, b, a in wanted, b in wanted))
            wanted |= {a, b}
    return tuple(reversed(kept))


def _sorting_network(count: int) -> list[tuple[int, int]]:
    pairs = []
    p = 1
    while p < count:
        k = p
        while k >= 1:
            for j in range(k % p, count - k, 2 * k):
                for i in range(min(k, count - j - k)):
                    if (i + j) // (2 * p) == (i + j + k) // (2 * p):
                        pairs.append((i + j, i + j + k))
            k //= 2
        p *= 2
    return pairs


def _ratio(distance: np.ndarray, scale: np.ndarray) -> np.ndarray:
    """distance / scale, 0 where the distance is 0 (no spread and no floor judge an equal vector equal)."""
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(distance == 0, 0.0, distance / scale)


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
