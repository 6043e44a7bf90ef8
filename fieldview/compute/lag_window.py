"""Autocorrelation at chosen nodes over a bounded window of lags, in the one pass of the moments.

A second pass would know the mean beforehand but replay every frame again, and replaying is what costs. The
one pass keeps for each lag the sums that let the mean be taken off at the end, and the last frames of
the window. So memory is set by the number of lags and nodes, never by the number of frames. The price is
that a correlation longer than the window is not seen whole: such nodes are counted, and what is made of
them is a bound. The integral scale is a smooth map, so on a large grid it is found at every few nodes.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from fieldview.compute.errors import InputError

LAGS = 64
"""Lags of the window unless asked otherwise."""

MOST_NODES = 2048
"""Nodes at which the autocorrelation is found."""

FEWEST_PAIRS = 8
"""Pairs of samples below which a lag is not used."""

_MOST_BIAS = 0.2
"""Largest correction; with fewer than five independent samples there is nothing to be mended."""


class LagWindow:
    """Sums for the autocovariance of each component at some nodes, frames in order of time.

    Parameters
    ----------
    names : sequence of str
    nodes : int
        Number n of nodes.
    lags : int
        Longest lag L. [frames]

    Attributes
    ----------
    frames : int
        Frames taken in; one without a value is added as NaN, so that lags stay right.
    """

    def __init__(self, names: Sequence[str], nodes: int, *, lags: int = LAGS):
        if lags < 1:
            raise InputError(f"the lag window is {lags} frames; give one or more")
        self.names, self.lags, self.frames = tuple(names), int(lags), 0
        size = (len(self.names), self.lags + 1, nodes)
        self._origin: np.ndarray | None = None
        self._products, self._sums = np.zeros(size), np.zeros(size)
        self._pairs = np.zeros(size)
        self._head: list[np.ndarray] = []
        # values and counts; every frame is written twice, so that the last L always lie in one piece
        self._ring = np.zeros((2, len(self.names), 2 * self.lags, nodes))

    def add(self, parts: Mapping[str, np.ndarray]) -> None:
        """The next frame: component name to ndarray (n,), NaN where there is no value."""
        values = np.stack([np.asarray(parts[name], float).reshape(-1) for name in self.names])
        if self._origin is None:
            # near the values, so that few digits are lost when the mean is taken off
            known = np.isfinite(values)
            self._origin = np.where(known, values, 0.0).sum(1, keepdims=True) / np.maximum(
                known.sum(1, keepdims=True), 1
            )
        values = values - self._origin
        place = self.frames % self.lags
        past = self._ring[..., place : place + self.lags, :][..., ::-1, :]
        now = _counted(values)
        self._count_in(slice(1, None), past, now[..., None, :])
        self._count_in(slice(0, 1), now[..., None, :], now[..., None, :])
        self._ring[..., place, :] = self._ring[..., place + self.lags, :] = now
        if self.frames < self.lags:
            self._head.append(now)
        self.frames += 1

    def merge(self, later: LagWindow) -> None:
        """The frames that follow directly in time, taken in by another window."""
        if (later.names, later.lags, later._pairs.shape) != (self.names, self.lags, self._pairs.shape):
            raise InputError("lag windows of other components, lags or nodes cannot be merged")
        if later._origin is None:
            return
        if self._origin is None:
            self._origin = later._origin
        step = later._origin - self._origin
        head = [_moved(frame, step) for frame in later._head]
        tail = self._tail()
        ahead = np.stack(head, axis=2)
        for back, old in enumerate(reversed(tail), start=1):
            reach = min(self.lags - back + 1, len(head))
            self._count_in(slice(back, back + reach), old[..., None, :], ahead[..., :reach, :])
        wide = step[:, None]
        self._products += later._products + wide * later._sums + wide**2 * later._pairs
        self._sums += later._sums + 2 * wide * later._pairs
        self._pairs += later._pairs
        self._head = (self._head + head)[: self.lags]
        self.frames += later.frames
        self._refill((tail + [_moved(frame, step) for frame in later._tail()])[-self.lags :])

    def correlation(self, means: Mapping[str, np.ndarray]) -> Correlation:
        """Autocorrelation about these means, component name to ndarray (n,)."""
        rho = {}
        for place, name in enumerate(self.names):
            mean = np.asarray(means[name], float).reshape(-1)
            if self._origin is not None:
                mean = mean - self._origin[place]
            pairs, products, sums = self._pairs[place], self._products[place], self._sums[place]
            enough = pairs >= FEWEST_PAIRS
            with np.errstate(divide="ignore", invalid="ignore"):
                covariance = np.where(enough, (products - mean * sums) / pairs + mean**2, np.nan)
                rho[name] = np.where(covariance[0] > 0, covariance / covariance[0], np.nan)
        return Correlation(rho)

    def _count_in(self, lags: slice, old: np.ndarray, new: np.ndarray) -> None:
        """Pairs of an earlier and a later frame, each as values and counts (2, C, lags, n)."""
        self._products[:, lags] += old[0] * new[0]
        self._sums[:, lags] += old[0] * new[1]
        self._sums[:, lags] += old[1] * new[0]
        self._pairs[:, lags] += old[1] * new[1]

    def _tail(self) -> list[np.ndarray]:
        """The last L frames, oldest first."""
        kept = min(self.frames, self.lags)
        place = self.frames % self.lags
        ordered = self._ring[..., place : place + self.lags, :]
        return [ordered[..., self.lags - kept + k, :].copy() for k in range(kept)]

    def _refill(self, tail: list[np.ndarray]) -> None:
        first = self.frames - len(tail)
        for k, frame in enumerate(tail):
            place = (first + k) % self.lags
            self._ring[..., place, :] = self._ring[..., place + self.lags, :] = frame


def _counted(values: np.ndarray) -> np.ndarray:
    """Values with zeros where there are none, and their counts of one or zero: (2, C, n)."""
    there = np.isfinite(values)
    return np.stack([np.where(there, values, 0.0), there])


def _moved(frame: np.ndarray, step: np.ndarray) -> np.ndarray:
    """A counted frame about another origin."""
    return np.stack([frame[0] + step * frame[1], frame[1]])


class Correlation:
    """What correlated samples are worth, from their autocorrelation up to where it first falls to zero.

    Beyond its first zero an estimated autocorrelation is mostly its own sampling error. In a flow that
    repeats itself the true one swings on; leaving that out makes the uncertainty of a mean too large, never
    too small.

    Parameters
    ----------
    rho : mapping of component name to ndarray (L + 1, n)
        rho[0] is 1; NaN where a lag has too few pairs.
    """

    def __init__(self, rho: Mapping[str, np.ndarray]):
        self.rho = dict(rho)
        self._positive = {
            name: np.logical_and.accumulate(np.nan_to_num(part, nan=-1.0) > 0, axis=0)
            for name, part in self.rho.items()
        }

    def corrected(self, counts: np.ndarray) -> Correlation:
        """The same with most of its bias taken off: every rho is too low by about 1 / N_eff.

        Parameters
        ----------
        counts : ndarray (n,)
            Samples N of each node.

        Source: Marriott & Pope (1954) Biometrika 41:390-402 (from memory), to first order.
        """
        corrected = {}
        for name, rho in self.rho.items():
            lost = np.minimum(self.inflation(name) / np.maximum(counts, 1), _MOST_BIAS)
            corrected[name] = (rho + lost) / (1 + lost)
        return Correlation(corrected)

    def known(self, name: str) -> np.ndarray:
        """bool (n,): nodes with enough pairs for the first lag."""
        return np.isfinite(self.rho[name][:2]).all(axis=0)

    def falls_to_zero(self, name: str) -> np.ndarray:
        """bool (n,): nodes where a zero is reached inside the window, so that the scale is no mere bound."""
        rho, positive = self.rho[name], self._positive[name]
        ends = positive.sum(axis=0)
        reached = ends < rho.shape[0]
        last = rho[np.minimum(ends, rho.shape[0] - 1), np.arange(rho.shape[1])]
        return reached & np.isfinite(last)

    def inflation(self, *names: str) -> np.ndarray:
        """1 + 2 times the sum over lags of the product of these components' rho: N over N_eff, (n,).

        One name serves the mean, a name twice the variance, two names their covariance, three or four times
        the third or fourth moment. NaN where nothing is known.
        """
        positive = np.logical_and.reduce([self._positive[name][1:] for name in names])
        factors = np.where(positive, np.prod([self.rho[name][1:] for name in names], axis=0), 0.0)
        known = np.logical_and.reduce([self.known(name) for name in names])
        return np.where(known, 1 + 2 * factors.sum(axis=0), np.nan)


class Thinning:
    """Every few rows and columns of a grid, so few that the lag window stays small.

    Parameters
    ----------
    shape : (int, int)
    most : int
        Nodes at most.
    """

    def __init__(self, shape: tuple[int, int], *, most: int = MOST_NODES):
        self.step = max(1, int(np.ceil(np.sqrt(shape[0] * shape[1] / most))))
        self._rows, self._columns = (np.arange(min(self.step // 2, n - 1), n, self.step) for n in shape)
        self.shape = shape

    @property
    def size(self) -> int:
        return self._rows.size * self._columns.size

    def thin(self, values: np.ndarray) -> np.ndarray:
        """The chosen nodes of a map (ny, nx), as (n,)."""
        return values[self._rows[:, None], self._columns].reshape(-1)

    def spread(self, values: np.ndarray) -> np.ndarray:
        """A map (ny, nx): each node takes the mean over the nearest chosen node and its eight neighbours.

        Single nodes scatter much more than the map changes from one to the next. Those without a value are
        left out of the means; where all nine are, the median of the map stands in.
        """
        table = values.reshape(self._rows.size, self._columns.size)
        known = np.isfinite(table)
        total, number = (_of_nine(part) for part in (np.where(known, table, 0.0), known.astype(float)))
        middle = np.median(table[known]) if known.any() else np.nan
        smooth = np.where(number > 0, total / np.maximum(number, 1), middle)
        rows, columns = (
            np.clip(np.arange(n) // self.step, 0, chosen.size - 1)
            for n, chosen in zip(self.shape, (self._rows, self._columns), strict=True)
        )
        return smooth[rows[:, None], columns]


def _of_nine(values: np.ndarray) -> np.ndarray:
    """Sum over each node and its neighbours."""
    framed = np.pad(values, 1)
    rows = framed[:-2] + framed[1:-1] + framed[2:]
    return rows[:, :-2] + rows[:, 1:-1] + rows[:, 2:]
