"""One series in time, with gaps: its correlation, and what a mean over it is worth."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.lag_window import Correlation

FEWEST_SAMPLES = 8


@dataclass(frozen=True, eq=False)
class Autocorrelation:
    """Autocorrelation of a series with gaps.

    Attributes
    ----------
    rho : ndarray (L + 1,)
        Coefficient by lag; rho[0] is 1. NaN where no two samples are this far apart.
    pairs : int ndarray (L + 1,)
        Pairs of samples behind each.
    zero : int or None
        First lag at which it is not positive; None where that lies beyond the lags looked at.
    """

    rho: np.ndarray
    pairs: np.ndarray
    zero: int | None

    @property
    def integral_scale(self) -> float:
        """1/2 + sum of rho up to its first zero, its bias taken off: the integral time scale. [samples]"""
        return 0.5 * self._inflation(1)

    def effective_number(self, count: int, *, power: int = 1) -> float:
        """N_eff of so many samples, for their mean (power 1) or their variance (power 2)."""
        return count / self._inflation(power)

    def _inflation(self, power: int) -> float:
        # the same rules as for the maps of a run
        found = Correlation({"": self.rho[:, None]}).corrected(np.array([self.pairs[0]]))
        return float(found.inflation(*("",) * power)[0])


def autocorrelation(values: np.ndarray, lags: int | None = None, *, biased: bool = False) -> Autocorrelation:
    """Autocorrelation about the mean.

    Parameters
    ----------
    values : ndarray (N,)
        Evenly spaced in time, NaN where missing.
    lags : int, optional
        Longest lag; a quarter of the series if left out. [samples]
    biased : bool
        Divide the sum at every lag by N alike, which makes it the classical r_k; otherwise each by its pairs.

    Raises
    ------
    InputError
        There are too few samples, or they are all the same.
    """
    series = np.asarray(values, float)
    there = np.isfinite(series)
    if there.sum() < 3:
        raise InputError(f"an autocorrelation needs three samples or more; there are {int(there.sum())}")
    away = np.where(there, series - series[there].mean(), 0.0)
    if not away.any():
        raise InputError("the series is constant, so it has no autocorrelation")
    lags = max(1, series.size // 4) if lags is None else min(int(lags), series.size - 1)
    size = 1 << int(np.ceil(np.log2(2 * series.size)))
    sums = _self_product(away, size)[: lags + 1]
    pairs = np.rint(_self_product(there.astype(float), size)[: lags + 1]).astype(int)
    with np.errstate(divide="ignore", invalid="ignore"):
        covariance = sums / (pairs[0] if biased else pairs)
    rho = np.where(pairs > 0, covariance / covariance[0], np.nan)
    negative = np.flatnonzero(rho[1:] <= 0)
    return Autocorrelation(rho, pairs, int(negative[0]) + 1 if negative.size else None)


def _self_product(values: np.ndarray, size: int) -> np.ndarray:
    spectrum = np.fft.rfft(values, size)
    return np.fft.irfft(np.abs(spectrum) ** 2, size)


@dataclass(frozen=True, eq=False)
class Convergence:
    """How mean and standard deviation settle as samples are added.

    Attributes
    ----------
    count : int ndarray (N,)
        Valid samples up to each instant.
    mean, deviation : ndarray (N,)
        NaN before there are one and two samples. [value]
    mean_uncertainty, deviation_uncertainty : ndarray (N,)
        Standard, from the correlation of the whole series; NaN where that is not known. [value]
    integral_scale : float
        [samples]
    """

    count: np.ndarray
    mean: np.ndarray
    deviation: np.ndarray
    mean_uncertainty: np.ndarray
    deviation_uncertainty: np.ndarray
    integral_scale: float


def convergence(values: np.ndarray) -> Convergence:
    """Mean and standard deviation of the first n samples for every n; NaN are left out.

    The correlation in time is taken from the whole series, since its beginning alone says too little of it.
    """
    series = np.asarray(values, float)
    there = np.isfinite(series)
    count = np.cumsum(there)
    # about the overall mean, so that the running sums of squares keep their digits
    centre = series[there].mean() if there.any() else 0.0
    away = np.where(there, series - centre, 0.0)
    first, second = np.cumsum(away), np.cumsum(away**2)
    with np.errstate(divide="ignore", invalid="ignore"):
        mean = np.where(count > 0, centre + first / count, np.nan)
        variance = np.where(count > 1, (second - first**2 / count) / (count - 1), np.nan)
        deviation = np.sqrt(np.maximum(variance, 0.0))
        if there.sum() < FEWEST_SAMPLES or not away.any():
            unknown = np.full(series.size, np.nan)
            return Convergence(count, mean, deviation, unknown, unknown, float("nan"))
        found = autocorrelation(series)
        kurtosis = np.mean(away[there] ** 4) / np.mean(away[there] ** 2) ** 2
        worth, worth_square = (found.effective_number(1, power=power) * count for power in (1, 2))
        return Convergence(
            count,
            mean,
            deviation,
            deviation / np.sqrt(worth),
            deviation * np.sqrt((kurtosis - 1) / (4 * worth_square)),
            found.integral_scale,
        )
