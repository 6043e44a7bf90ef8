"""Moments of a run at every node, one frame at a time.

Counts, means and central moments up to the fourth are kept, never sums of powers: a sum of squares loses
its digits where the mean is large beside the fluctuation. Two partial results merge to what one pass over
all frames gives, in any order, so a run can be shared out. Memory is that of some dozen maps, whatever
the number of frames.

Sources: Welford (1962) Technometrics 4:419-420; Chan, Golub & LeVeque (1983) Am. Stat. 37:242-247 for the
merging of second moments; higher and mixed ones follow from the binomial theorem in the same way (Pébay
2008, Sandia report SAND2008-6212) (from memory).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import cache
from itertools import combinations, product
from math import comb

import numpy as np

from fieldview.compute.errors import InputError

Powers = tuple[int, ...]
"""Exponents of the components' fluctuations, one each: (1, 1) is that of <u'v'>."""


class Moments:
    """Count, mean and central moments of one or more components at every node.

    A node of a frame counts where every component has a value; NaN marks those without.

    Parameters
    ----------
    names : sequence of str
        Components, such as ``("u", "v")``.
    shape : tuple of int
        Of the maps, (ny, nx); ``()`` for a single series.

    Attributes
    ----------
    count : int ndarray (ny, nx)
        Samples behind each node.
    """

    def __init__(self, names: Sequence[str], shape: tuple[int, ...] = ()):
        self.names, self.shape = tuple(names), tuple(shape)
        self.count = np.zeros(self.shape, np.int64)
        self._mean = [np.zeros(self.shape) for _ in self.names]
        self._central = {powers: np.zeros(self.shape) for powers in _tracked(len(self.names))}
        self._noise = [np.zeros(self.shape) for _ in self.names]

    def add(
        self, parts: Mapping[str, np.ndarray], *, noise_variance: Mapping[str, np.ndarray] | None = None
    ) -> None:
        """One more frame.

        Parameters
        ----------
        parts : mapping of component name to ndarray (ny, nx)
            NaN where the frame has no value. [velocity]
        noise_variance : mapping of component name to ndarray (ny, nx), optional
            Variance of the random errors of this frame's values. [velocity^2]
        """
        values = [np.asarray(parts[name], float) for name in self.names]
        if any(part.shape != self.shape for part in values):
            raise InputError(
                f"a frame of shape {values[0].shape} cannot be added to statistics of shape {self.shape}; "
                "all frames must be on one grid"
            )
        valid = np.logical_and.reduce([np.isfinite(part) for part in values])
        self._combine(valid.astype(np.int64), [np.where(valid, part, 0.0) for part in values], None)
        for name, total in zip(self.names, self._noise, strict=True):
            # an unknown variance spoils the node's sum and is found again as NaN
            known = np.nan if noise_variance is None else noise_variance.get(name, np.nan)
            total += np.where(valid, known, 0.0)

    def merge(self, other: Moments) -> None:
        """The frames of another partial result as well."""
        if other.names != self.names or other.shape != self.shape:
            raise InputError("statistics of other components or another grid cannot be merged")
        self._combine(other.count, other._mean, other._central)
        for total, more in zip(self._noise, other._noise, strict=True):
            total += more

    def mean(self, name: str) -> np.ndarray:
        """Mean (ny, nx), NaN where there is no sample. [velocity]"""
        return np.where(self.count > 0, self._mean[self._place(name)], np.nan)

    def central(self, *names: str) -> np.ndarray:
        """Mean product of fluctuations, biased (divided by N): ``central("u", "u", "v")`` is <u'u'v'>."""
        powers = tuple(names.count(name) for name in self.names)
        if len(names) != sum(powers) or powers not in self._central:
            raise InputError(f"the moment of {'·'.join(names)} is not kept")
        return _ratio(self._central[powers], self.count)

    def covariance(self, first: str, second: str) -> np.ndarray:
        """Unbiased (divided by N - 1) covariance (ny, nx); NaN below two samples. [velocity^2]"""
        powers = [0] * len(self.names)
        powers[self._place(first)] += 1
        powers[self._place(second)] += 1
        return _ratio(self._central[tuple(powers)], self.count - 1)

    def deviation(self, name: str) -> np.ndarray:
        """Standard deviation (ny, nx), from N - 1. [velocity]"""
        return np.sqrt(self.covariance(name, name))

    def skewness(self, name: str) -> np.ndarray:
        """<u'^3> / <u'^2>^(3/2) (ny, nx); 0 for a symmetric distribution. [1]"""
        return _ratio(self.central(*(name,) * 3), self.central(name, name) ** 1.5)

    def kurtosis(self, name: str) -> np.ndarray:
        """<u'^4> / <u'^2>^2 (ny, nx); 3 for a normal distribution. [1]"""
        return _ratio(self.central(*(name,) * 4), self.central(name, name) ** 2)

    def noise_variance(self, name: str) -> np.ndarray:
        """Mean over the samples of the random errors' variance (ny, nx), NaN if not known. [velocity^2]"""
        return _ratio(self._noise[self._place(name)], self.count)

    def _place(self, name: str) -> int:
        if name not in self.names:
            raise InputError(f"there are no statistics of {name}, only of {', '.join(self.names)}")
        return self.names.index(name)

    def _combine(self, count, means, central) -> None:
        """Take in a part with these counts, means and central moments (None: all zero)."""
        total = self.count + count
        share = count / np.maximum(total, 1)
        away = [new - old for new, old in zip(means, self._mean, strict=True)]
        # from each part's own mean to the common one
        here = [-share * step for step in away]
        there = [step + back for step, back in zip(away, here, strict=True)]
        ours, theirs = _powers(here), _powers(there)
        merged = {
            powers: _shifted(powers, self.count, self._central, ours)
            + _shifted(powers, count, central, theirs)
            for powers in self._central
        }
        self._mean = [old - step for old, step in zip(self._mean, here, strict=True)]
        self.count, self._central = total, merged


@cache
def _tracked(number: int) -> tuple[Powers, ...]:
    """Exponents kept for so many components: what the stresses and their uncertainties need."""
    unit = np.eye(number, dtype=int)
    single = [tuple(order * unit[i]) for i in range(number) for order in (2, 3, 4)]
    paired = [
        tuple(a * unit[i] + b * unit[j])
        for i, j in combinations(range(number), 2)
        for a, b in ((1, 1), (2, 1), (1, 2), (2, 2))
    ]
    return tuple(tuple(int(p) for p in powers) for powers in (*single, *paired))


@cache
def _terms(powers: Powers) -> tuple[tuple[Powers, int], ...]:
    """Lower moments in the binomial expansion, with their coefficients; first moments vanish."""
    terms = []
    for lower in product(*(range(p + 1) for p in powers)):
        if sum(lower) != 1:
            terms.append((lower, int(np.prod([comb(p, q) for p, q in zip(powers, lower, strict=True)]))))
    return tuple(terms)


def _powers(steps: list[np.ndarray]) -> list[list[np.ndarray]]:
    """Powers 0 to 4 of each component's step."""
    found = []
    for step in steps:
        square = step * step
        found.append([1.0, step, square, square * step, square * square])
    return found


def _shifted(powers: Powers, count, central, steps) -> np.ndarray:
    """Sum over a part of the product of (fluctuation + step) to these powers."""
    total = 0.0
    for lower, coefficient in _terms(powers):
        if any(lower) and central is None:
            continue
        term = central[lower] if any(lower) else count
        for rest, step in zip(np.subtract(powers, lower), steps, strict=True):
            if rest:
                term = term * step[rest]
        total = total + (term if coefficient == 1 else coefficient * term)
    return total


def _ratio(above: np.ndarray, below: np.ndarray) -> np.ndarray:
    below = np.asarray(below, float)
    return np.where(below > 0, above / np.where(below > 0, below, 1.0), np.nan)
