"""Peak locking: image displacements that shun fractions of a pixel."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

BINS = 40
"""Bins of the histogram over one pixel."""

LEAST_SPREAD = 0.5
"""Standard deviation of the displacements below which they tell nothing: were they normal, they would
themselves leave exp(-2 (pi 0.5)^2) = 0.7 % of index. [px]"""


@dataclass(frozen=True, eq=False)
class Locking:
    """How far displacements of one component gather at whole pixels.

    Attributes
    ----------
    fractions : int ndarray (BINS,)
        Displacements by their distance from the nearest whole pixel, from -1/2 to 1/2.
    index : float
        Mean of cos(2 pi d): 0 for displacements spread evenly, 1 where all are whole pixels, negative where
        they gather at halves. NaN without displacements.
    uncertainty : float
        Standard, from the scatter between frames; NaN for one frame.
    spread : float
        Standard deviation of the displacements. [px]
    count : int
    """

    fractions: np.ndarray
    index: float
    uncertainty: float
    spread: float
    count: int

    @property
    def telling(self) -> bool:
        """Whether the displacements cover enough of a pixel to tell."""
        return self.count > 0 and self.spread >= LEAST_SPREAD


class FractionHistogram:
    """Fractional parts of the displacements of one component, frame by frame."""

    def __init__(self):
        self._fractions = np.zeros(BINS, np.int64)
        self._frames: list[tuple[int, float, float, float]] = []

    def add(self, displacements: np.ndarray) -> None:
        """Displacements of one frame, any shape, NaN where none. [px]"""
        values = displacements[np.isfinite(displacements)]
        if not values.size:
            return
        fractions = (values + 0.5) % 1.0
        self._fractions += np.histogram(fractions, bins=BINS, range=(0.0, 1.0))[0]
        cosine = float(np.cos(2 * np.pi * values).sum())
        self._frames.append((values.size, cosine, float(values.mean()), float(values.var())))

    def merge(self, other: FractionHistogram) -> None:
        self._fractions += other._fractions
        self._frames += other._frames

    def result(self) -> Locking:
        if not self._frames:
            return Locking(self._fractions.copy(), float("nan"), float("nan"), float("nan"), 0)
        number, cosine, mean, variance = np.array(self._frames).T
        total = number.sum()
        index = cosine.sum() / total
        middle = (number * mean).sum() / total
        spread = np.sqrt((number * (variance + (mean - middle) ** 2)).sum() / total)
        uncertainty = float("nan")
        if number.size > 1:
            # of a ratio of sums over frames
            rest = cosine - index * number
            uncertainty = np.sqrt((rest**2).sum() * number.size / (number.size - 1)) / total
        return Locking(self._fractions.copy(), float(index), float(uncertainty), float(spread), int(total))
