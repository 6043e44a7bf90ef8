"""Linear interpolation across gaps over Delaunay triangles of the nodes that touch them.

On a lattice the Delaunay triangles are not unique: any two triangles of a square share one circle. Which
diagonal is drawn must not depend on chance or on the direction in which nodes are numbered, so four
triangulations are averaged, of the lattice drawn out a little along x and along y, and sheared a
little to either side. The result is the same for a mirrored or turned lattice, and a single missing
node becomes the mean of its four neighbours (on even spacing).
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import scipy.sparse as sp

from fieldview.compute.grid import Grid

_STRETCH = 1e-5
"""Share by which the lattice is drawn out and sheared to choose among equally good triangles."""

_LARGEST_KEPT = 100
"""Nodes of a gap's bounding box up to which its weights are kept for the next gap of the same shape."""

_TOLERANCE = 1e-9
"""How far outside a triangle, in its own coordinates, a node may lie and still belong to it."""


def linear_weights(grid: Grid, valid: np.ndarray, label: np.ndarray) -> sp.csr_array:
    """Weights (n, n) of the valid nodes at the nodes of each gap; rows out of the hull are empty.

    Parameters
    ----------
    grid : Grid
    valid : bool ndarray (ny, nx)
    label : int ndarray (ny, nx)
        Number of the gap at each of its nodes, 0 outside.
    """
    nx = valid.shape[1]
    pieces = _Pieces(valid.size)
    spacing = grid.spacing if all(grid.is_uniform) else None
    for box, number in _boxes(label):
        gap = label[box] == number
        ring = _ring(gap) & valid[box]
        if spacing is not None and gap.size <= _LARGEST_KEPT:
            found = _of_shape(gap.tobytes(), ring.tobytes(), gap.shape, spacing)
        else:
            found = _across(gap, ring, grid.x[box[1]], grid.y[box[0]])
        pieces.add(box, nx, np.nonzero(gap), np.nonzero(ring), found)
    return pieces.matrix()


@lru_cache(maxsize=20_000)
def _of_shape(gap: bytes, ring: bytes, shape: tuple[int, int], spacing: tuple[float, float]):
    """Weights of a gap of this shape on an evenly spaced lattice, wherever it lies."""
    marks = [np.frombuffer(part, bool).reshape(shape) for part in (gap, ring)]
    # an axis of one node has no spacing
    x, y = (
        np.arange(count) * (step if count > 1 else 1.0)
        for count, step in zip(shape[::-1], spacing, strict=True)
    )
    return _across(*marks, x, y)


def _across(gap: np.ndarray, ring: np.ndarray, x: np.ndarray, y: np.ndarray):
    """(target, site, weight) for the nodes of a gap and of its ring, each numbered row by row."""
    nodes = x[None, :] + 1j * y[:, None]
    return _interpolation(nodes[ring], nodes[gap])


class _Pieces:
    """Matrix entries gathered gap by gap."""

    def __init__(self, size: int):
        self.size = size
        self.entries: tuple[list, list, list] = ([], [], [])

    def add(self, box, nx, gap, ring, found) -> None:
        target, source, weight = found
        top, left = box[0].start, box[1].start
        self.entries[0].append((gap[0][target] + top) * nx + gap[1][target] + left)
        self.entries[1].append((ring[0][source] + top) * nx + ring[1][source] + left)
        self.entries[2].append(weight)

    def matrix(self) -> sp.csr_array:
        if not self.entries[0]:
            return sp.csr_array((self.size, self.size))
        rows, columns, weights = (np.concatenate(part) for part in self.entries)
        return sp.csr_array((weights, (rows, columns)), shape=(self.size, self.size))


def _boxes(label: np.ndarray):
    """For every gap its bounding box with a margin of one node, and its number."""
    from scipy import ndimage

    for number, box in enumerate(ndimage.find_objects(label), start=1):
        if box is not None:
            yield (
                tuple(
                    slice(max(part.start - 1, 0), min(part.stop + 1, size))
                    for part, size in zip(box, label.shape, strict=True)
                ),
                number,
            )


def _ring(gap: np.ndarray) -> np.ndarray:
    """Nodes that touch the gap, corners included."""
    wide = gap.copy()
    wide[1:] |= gap[:-1]
    wide[:-1] |= gap[1:]
    tall = wide.copy()
    tall[:, 1:] |= wide[:, :-1]
    tall[:, :-1] |= wide[:, 1:]
    return tall & ~gap


def _interpolation(sites: np.ndarray, targets: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(target, site, weight) of linear interpolation among complex ``sites`` at complex ``targets``."""
    line = _on_a_line(sites)
    if line is not None:
        return _along_line(sites, targets, line)
    corner = sites[0]
    sites, targets = sites - corner, targets - corner
    span = np.abs(sites).max()
    parts = []
    for stretch in (_STRETCH, -_STRETCH):
        for shear in (_STRETCH, -_STRETCH):
            change = np.array([[1 + stretch, shear], [shear, 1 - stretch]])
            drawn = [np.column_stack([z.real, z.imag]) @ change / span for z in (sites, targets)]
            parts.append(_triangulated(*drawn))
    target, site, weight = (np.concatenate(column) for column in zip(*parts, strict=True))
    return _merged(target, site, weight, len(sites))


def _triangulated(sites: np.ndarray, targets: np.ndarray):
    from scipy.spatial import Delaunay

    triangles = Delaunay(sites).simplices
    arms = sites[triangles[:, :2]] - sites[triangles[:, 2:]]
    area = np.abs(arms[:, 0, 0] * arms[:, 1, 1] - arms[:, 0, 1] * arms[:, 1, 0])
    triangles = triangles[area > 1e-12]  # slivers along a straight edge of the hull
    corners = sites[triangles]
    frames = np.linalg.inv(np.swapaxes(corners[:, :2] - corners[:, 2:], 1, 2))
    first_two = np.einsum("tij,ntj->nti", frames, targets[:, None, :] - corners[None, :, 2])
    shares = np.concatenate([first_two, 1 - first_two.sum(axis=2, keepdims=True)], axis=2)
    worst = shares.min(axis=2)
    best = worst.argmax(axis=1)
    inside = np.flatnonzero(worst[np.arange(len(targets)), best] >= -_TOLERANCE)
    chosen = best[inside]
    weights = np.maximum(shares[inside, chosen], 0.0)
    return np.repeat(inside, 3), triangles[chosen].ravel(), weights.ravel()


def _merged(target, site, weight, site_count):
    pair, inverse = np.unique(target * site_count + site, return_inverse=True)
    total = np.bincount(inverse, weight).astype(float)  # whole numbers where there is nothing
    target, site = pair // site_count, pair % site_count
    # the sum is the number of triangulations: all four, but for round-off on the edge of the hull
    total /= np.bincount(target, total)[target] if target.size else 1.0
    keep = total > 1e-12
    return target[keep], site[keep], total[keep]


def _on_a_line(sites: np.ndarray) -> complex | None:
    """Direction of the line that all the sites lie on, 0 for fewer than two of them, None if they do not."""
    if sites.size < 2:
        return 0j
    arms = sites - sites[0]
    longest = arms[np.abs(arms).argmax()]
    direction = longest / abs(longest)
    off = np.abs((arms * direction.conjugate()).imag).max()
    return direction if off <= 1e-9 * abs(longest) else None


def _along_line(sites, targets, direction):
    """Interpolation between the two neighbours on a line, for targets that lie on it."""
    nothing = (np.zeros(0, int), np.zeros(0, int), np.zeros(0))
    if direction == 0:
        return nothing
    place = ((sites - sites[0]) * direction.conjugate()).real
    arms = (targets - sites[0]) * direction.conjugate()
    reach = np.ptp(place)
    on = (np.abs(arms.imag) <= 1e-9 * reach) & (arms.real >= place.min()) & (arms.real <= place.max())
    order = np.argsort(place)
    which = np.flatnonzero(on)
    if which.size == 0:
        return nothing
    after = np.clip(np.searchsorted(place[order], arms.real[which]), 1, len(sites) - 1)
    low, high = order[after - 1], order[after]
    share = (arms.real[which] - place[low]) / (place[high] - place[low])
    return (
        np.repeat(which, 2),
        np.column_stack([low, high]).ravel(),
        np.column_stack([1 - share, share]).ravel(),
    )
