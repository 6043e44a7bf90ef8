"""Normalised median residuals, fast: planes of neighbours sorted by comparator networks, block by block.

The nodes are taken as one long line of framed rows, so that neighbours are slices of it; blocks of the line
stay in the cache.
"""

from __future__ import annotations

from functools import cache

import numpy as np

_BLOCK_NODES = 32_000
"""Nodes worked on at a time with 8 neighbours."""

_FEW_NODES = 8_000
"""The same where their neighbours are gathered one by one."""

_LARGEST_NETWORK = 48
"""Neighbours up to which a comparator network beats a partial sort of every node's own list."""

_FAR = 1e300
"""Where neighbours that are not usable are moved to; finite, so that nothing turns into NaN."""


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
    side, width = 2 * radius + 1, nx + 2 * radius
    gone = np.ones((ny + 2 * radius, width), bool)
    np.logical_not(usable, out=gone[radius:-radius, radius:-radius])
    lines = [_framed(part, gone, radius) for part in parts]
    steps = [dy * width + dx for dy in range(side) for dx in range(side) if (dy, dx) != (radius, radius)]
    field = _Framed(lines, gone.ravel(), steps, radius * width + radius, floors)
    absent = _absent(gone.ravel(), radius, width)
    residual = np.empty(field.length + 2 * radius)
    block = min(field.length, max(1, _BLOCK_NODES * 8 // len(steps)))
    if radius == 1:
        usual = _Ring(width)
        for start in range(0, field.length, block):
            stop = min(start + block, field.length)
            usual.residual(field, start, absent[start:stop], residual[start:stop])
        left = np.flatnonzero((absent > 1) & ~field.gone[field.middle :][: field.length])
    else:
        left = np.arange(field.length)
    block = max(1, _FEW_NODES * 8 // len(steps))
    for start in range(0, left.size, block):
        nodes = left[start : start + block]
        residual[nodes] = field.residual(nodes, absent[nodes])
    neighbours = np.zeros(residual.size, np.int16)
    np.subtract(len(steps), absent, out=neighbours[: field.length])
    return residual.reshape(ny, width)[:, :nx], neighbours.reshape(ny, width)[:, :nx]


def _framed(part: np.ndarray, gone: np.ndarray, radius: int) -> np.ndarray:
    """The values in a frame ``radius`` wide, far up where gone, as one line."""
    line = np.empty(gone.shape)
    np.copyto(line[radius:-radius, radius:-radius], part)
    np.copyto(line, _FAR, where=gone)
    return line.ravel()


def _absent(gone: np.ndarray, radius: int, width: int) -> np.ndarray:
    """Number of neighbours that are gone, for the nodes of the line from the first one not in the frame."""
    total = gone.astype(np.int16)
    for stride in (1, width):
        size = total.size - 2 * radius * stride
        summed = total[:size] + total[stride:][:size]
        for k in range(2, 2 * radius + 1):
            summed += total[k * stride :][:size]
        total = summed
    return total - gone[radius * (width + 1) :][: total.size]


class _Framed:
    """The components as long lines of framed rows, and the general way to the residual of any of its nodes.

    Nodes are numbered from the first that is not in the frame; ``steps`` lead from there to the neighbours
    and ``middle`` to the node itself.
    """

    def __init__(self, lines, gone, steps, middle: int, floors):
        self.lines, self.gone, self.steps, self.middle, self.floors = lines, gone, steps, middle, floors
        self.length = gone.size - 2 * middle

    def residual(self, nodes: np.ndarray, absent: np.ndarray) -> np.ndarray:
        """Largest of |centre - median| / (median distance from it + floor) at these nodes.

        Every other absent neighbour is turned from far up to far down, so that they drop out of the median:
        with an even number of them it stays the mean of the two middle planes, with an odd number it is
        the lower.
        """
        odd = (absent & 1).astype(bool)
        members = [nodes + step for step in self.steps]
        gone = np.stack([self.gone[member] for member in members])
        pads = np.empty(gone.shape)
        side = np.full(nodes.size, _FAR)
        for pad, absence in zip(pads, gone, strict=True):
            np.multiply(side, absence, out=pad)
            side -= 2 * pad
        largest = None
        for line, floor in zip(self.lines, self.floors, strict=True):
            planes = np.stack([line[member] for member in members])
            middle = _median(np.where(gone, pads, planes), odd)
            planes -= middle
            np.abs(planes, out=planes)
            spread = _median(np.where(gone, pads, planes), odd)
            ratio = _normalised(line[nodes + self.middle], middle, spread, floor, np.empty(nodes.size))
            largest = ratio if largest is None else np.maximum(largest, ratio)
        return largest


def _normalised(centre, middle, spread, floor: float, out: np.ndarray) -> np.ndarray:
    """Westerweel & Scarano (2005), eq. 2; the spread is used up."""
    np.abs(np.subtract(centre, middle, out=out), out=out)
    spread += floor
    if floor == 0.0:
        # without a floor an equal vector among equal ones is judged equal
        spread[out == 0] = 1.0
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        return np.divide(out, spread, out=out)


def _median(planes: np.ndarray, odd: np.ndarray) -> np.ndarray:
    """Mean of the two middle planes (of count, nodes), the lower where ``odd``; the planes are used up."""
    half = len(planes) // 2
    if len(planes) <= _LARGEST_NETWORK:
        work = _sorted_by(_middle_network(len(planes)), list(planes), np.empty_like(planes[0]))
        low, high = work[half - 1], work[half]
    else:
        low, high = np.partition(planes, (half - 1, half), axis=0)[half - 1 : half + 1]
    return np.where(odd, low, 0.5 * (low + high))


def _sorted_by(network, work: list[np.ndarray], spare: np.ndarray) -> list[np.ndarray]:
    """The planes after a comparator network, in new places."""
    work = list(work)
    for a, b, need_low, need_high in network:
        if need_low and need_high:
            np.minimum(work[a], work[b], out=spare)
            np.maximum(work[a], work[b], out=work[b])
            work[a], spare = spare, work[a]
        elif need_low:
            np.minimum(work[a], work[b], out=work[a])
        else:
            np.maximum(work[a], work[b], out=work[b])
    return work


@cache
def _middle_network(count: int) -> tuple[tuple[int, int, bool, bool], ...]:
    """Comparators (a, b, lower needed, higher needed) that bring the two middle values into place.

    Those of the sorting network that the middle depends on.
    """
    wanted = {count // 2 - 1, count // 2}
    kept = []
    for a, b, _, _ in reversed(_sorting_network(count)):
        if a in wanted or b in wanted:
            kept.append((a, b, a in wanted, b in wanted))
            wanted |= {a, b}
    return tuple(reversed(kept))


@cache
def _sorting_network(count: int) -> tuple[tuple[int, int, bool, bool], ...]:
    """Batcher's odd-even merge sort (1968, AFIPS Spring Joint Computer Conf. 32:307-314)."""
    pairs = []
    p = 1
    while p < count:
        k = p
        while k >= 1:
            for j in range(k % p, count - k, 2 * k):
                for i in range(min(k, count - j - k)):
                    if (i + j) // (2 * p) == (i + j + k) // (2 * p):
                        pairs.append((i + j, i + j + k, True, True))
            k //= 2
        p *= 2
    return tuple(pairs)


class _Ring:
    """The eight neighbours of a block of nodes of which at most one is absent, far up.

    Once they are sorted, s0 ... s7, the distances from the median on either side of it are sorted too, and
    the middle ones of all are found by merging the two lists: the k-th smallest of both is the least of
    max(L_i, R_j) over i + j = k.
    """

    def __init__(self, width: int):
        self.width = width
        self._pairs = np.empty((4, _BLOCK_NODES + 2 * width))
        self._planes = np.empty((13, _BLOCK_NODES))

    def residual(self, field: _Framed, start: int, absent: np.ndarray, out: np.ndarray) -> None:
        """The largest residual over the components at the nodes from ``start`` on."""
        *work, spare, middle, spread, half, ratio = self._planes[:, : out.size]
        np.multiply(0.5, absent == 0, out=half)
        for number, (line, floor) in enumerate(zip(field.lines, field.floors, strict=True)):
            ordered = self._sorted(line, start, work, spare)
            _median_and_spread(ordered, half, middle, spread)
            centre = line[start + field.middle :][: out.size]
            _normalised(centre, middle, spread, floor, out=ratio if number else out)
            if number:
                np.maximum(out, ratio, out=out)

    def _sorted(self, line, start: int, work: list[np.ndarray], spare: np.ndarray) -> list[np.ndarray]:
        """The eight planes in order. The network's first layer serves two nodes at a time."""
        size, width = work[0].size, self.width
        row_low, row_high, column_low, column_high = self._pairs
        # neighbouring pairs along a row and down a column, from the north and the north-west of the block on
        along, down = size + 2 * width - 1, size + width + 2
        here, after = line[start + 1 :][:along], line[start + 2 :][:along]
        np.minimum(here, after, out=row_low[:along])
        np.maximum(here, after, out=row_high[:along])
        here, after = line[start:][:down], line[start + width :][:down]
        np.minimum(here, after, out=column_low[:down])
        np.maximum(here, after, out=column_high[:down])
        places = ((column_low, column_high, 0), (row_low, row_high, 0))
        places += ((column_low, column_high, width + 2), (row_low, row_high, 2 * width - 1))
        paired = [part[offset:][:size] for low, high, offset in places for part in (low, high)]
        network = _sorting_network(8)
        for a, b, _, _ in network[4:8]:
            np.minimum(paired[a], paired[b], out=work[a])
            np.maximum(paired[a], paired[b], out=work[b])
        return _sorted_by(network[8:], work, spare)


def _median_and_spread(ordered: list[np.ndarray], half: np.ndarray, middle, spread) -> None:
    """Median of eight sorted planes and median distance from it, into the last two; see `_Ring`."""
    # the mean of the middle two, or the lower of them where one neighbour is far up (half is 0 there)
    s0, s1, s2, s3, s4, s5, s6, s7 = ordered
    np.subtract(s4, s3, out=middle)
    middle *= half
    middle += s3
    spare = s3
    below = [None, None, *(np.subtract(middle, plane, out=plane) for plane in (s2, s1, s0))]
    above = [None, *(np.subtract(plane, middle, out=plane) for plane in (s4, s5, s6, s7))]
    fourth = np.maximum(below[3], above[1], out=spread)
    np.minimum(fourth, above[3], out=fourth)
    np.minimum(fourth, below[4], out=fourth)
    np.minimum(fourth, np.maximum(below[2], above[2], out=spare), out=fourth)
    fifth = np.maximum(below[2], above[3], out=above[1])
    np.minimum(fifth, above[4], out=fifth)
    np.minimum(fifth, below[4], out=fifth)
    np.minimum(fifth, np.maximum(below[3], above[2], out=spare), out=fifth)
    fifth -= fourth
    fifth *= half
    fourth += fifth
