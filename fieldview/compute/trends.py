"""Jumps and drift of a figure that every frame of a run has."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.medians import MAD_TO_SIGMA
from fieldview.compute.time_series import autocorrelation

FEWEST_FRAMES = 8
JUMP = 8.0
"""Change from frame to frame, in scaled median deviations of all such changes, that is a jump; of normal
changes one in 10^15 is as large, of those of a sine none."""


@dataclass(frozen=True)
class Drift:
    """Linear trend of a series over its whole length.

    Attributes
    ----------
    change : float
        From the first frame to the last, along the fitted line. [value]
    uncertainty : float
        Standard, from the scatter about the line and its correlation in time. [value]
    """

    change: float
    uncertainty: float

    @property
    def clear(self) -> bool:
        return abs(self.change) > 2 * self.uncertainty


def jumps(values: np.ndarray, *, floor: float = 0.0) -> np.ndarray:
    """Numbers of the frames that differ from the one before by more than the usual: int ndarray.

    Parameters
    ----------
    values : ndarray (N,)
        NaN where a frame has none; it is passed over.
    floor : float
        Changes below it are never jumps. [value]
    """
    series = np.asarray(values, float)
    there = np.flatnonzero(np.isfinite(series))
    if there.size < FEWEST_FRAMES:
        return np.array([], int)
    steps = np.diff(series[there])
    away = np.abs(steps - np.median(steps))
    limit = max(JUMP * MAD_TO_SIGMA * float(np.median(away)), floor)
    return there[1:][away > limit]


def drift(values: np.ndarray) -> Drift:
    """Straight line through a series with gaps, evenly spaced in time.

    Raises
    ------
    InputError
        There are too few values.
    """
    series = np.asarray(values, float)
    there = np.isfinite(series)
    number = int(there.sum())
    if number < FEWEST_FRAMES:
        raise InputError(f"a drift needs {FEWEST_FRAMES} frames or more; there are {number}")
    time = np.arange(series.size) - np.flatnonzero(there).mean()
    known = time[there]
    slope, level = (known @ series[there]) / (known @ known), series[there].mean()
    rest = series - (level + slope * time)
    scatter = np.sqrt(np.sum(rest[there] ** 2) / (number - 2))
    inflation = 1.0
    if scatter > 1e-12 * max(abs(level), abs(slope) * number):
        found = autocorrelation(rest)
        inflation = number / found.effective_number(number)
    uncertainty = scatter * np.sqrt(inflation / (known @ known))
    length = known[-1] - known[0]
    return Drift(float(slope * length), float(uncertainty * length))
