"""Spectra of a series in time.

Evenly sampled series go through Welch's method; where samples are missing, segments go through the
Lomb–Scargle periodogram at the same frequencies and with the same meaning.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError

FEWEST_SAMPLES = 8
WINDOWS = ("hann", "boxcar")


@dataclass(frozen=True, eq=False)
class Spectrum:
    """One-sided power spectral density.

    Attributes
    ----------
    frequency : ndarray (K,)
        [1/time]
    density : ndarray (K,)
        Its integral over frequency is the variance: exactly so for whole boxcar segments. [value^2 time]
    low, high : ndarray (K,)
        Limits of the confidence band of each value on its own. [value^2 time]
    confidence : float
    degrees_of_freedom : float
        Of the chi-squared distribution behind the band.
    segments : int
    method : str
        "Welch" or "Lomb–Scargle".
    missing : float
        Share of samples that are missing.
    """

    frequency: np.ndarray
    density: np.ndarray
    low: np.ndarray
    high: np.ndarray
    confidence: float
    degrees_of_freedom: float
    segments: int
    method: str
    missing: float


def spectrum(
    values: np.ndarray,
    interval: float,
    *,
    segment: int | None = None,
    window: str = "hann",
    overlap: float = 0.5,
    confidence: float = 0.95,
) -> Spectrum:
    """Power spectral density with the mean of every segment removed.

    Parameters
    ----------
    values : ndarray (N,)
        Evenly spaced, NaN where missing.
    interval : float
        Between samples. [time]
    segment : int, optional
        Samples of a segment; an eighth of the series, but at least 64 where it has them, if left out.
    window : "hann" or "boxcar"
    overlap : float
        Share of a segment that the next one repeats, 0 to 0.9.
    confidence : float

    Raises
    ------
    InputError
        Too few samples, or an argument that makes no sense.

    Source: Welch (1967) IEEE Trans. Audio Electroacoust. 15:70-73, also for the degrees of freedom of
    overlapping segments (from memory); Scargle (1982) Astrophys. J. 263:835-853 (from memory).
    """
    series = checked_series(values, interval)
    if window not in WINDOWS:
        raise InputError(f'window is "{window}"; the windows are: {", ".join(WINDOWS)}')
    if not 0 <= overlap <= 0.9 or not 0 < confidence < 1:
        raise InputError(f"overlap is {overlap} and confidence {confidence}; give 0 to 0.9, and 0 to 1")
    segment = _segment(series.size, segment)
    step = max(1, round(segment * (1 - overlap)))
    starts = np.arange(0, series.size - segment + 1, step)
    missing = float(np.mean(~np.isfinite(series)))
    if missing == 0:
        frequency, density = _welch(series, interval, window, segment, segment - step)
        used = starts.size
    else:
        frequency, density, used = _lomb(series, interval, window, segment, starts)
    freedom = 2 * used / _variance_growth(window, segment, step, used)
    low, high = _band(density, freedom, confidence)
    method = "Welch" if missing == 0 else "Lomb–Scargle"
    return Spectrum(frequency, density, low, high, confidence, freedom, used, method, missing)


def checked_series(values, interval: float) -> np.ndarray:
    """The series as an array; InputError if it is too short or the interval is not positive."""
    series = np.asarray(values, float)
    there = int(np.isfinite(series).sum())
    if there < FEWEST_SAMPLES:
        raise InputError(f"a spectrum needs {FEWEST_SAMPLES} samples or more; there are {there}")
    if not interval > 0:
        raise InputError(f"the interval between samples is {interval}; give a positive time")
    return series


def _segment(count: int, segment: int | None) -> int:
    if segment is None:
        return min(count, max(64, count // 8))
    if not FEWEST_SAMPLES <= segment <= count:
        raise InputError(f"segment is {segment} samples; give {FEWEST_SAMPLES} to {count}")
    return int(segment)


def _welch(series, interval, window, segment, shared):
    from scipy.signal import welch

    return welch(series, 1 / interval, window=window, nperseg=segment, noverlap=shared, detrend="constant")


def _lomb(series, interval, window, segment, starts):
    """Mean over the segments of periodograms of the samples that are there."""
    from scipy.signal import get_window, lombscargle

    frequency = np.fft.rfftfreq(segment, interval)
    weight = get_window(window, segment)
    time = interval * np.arange(segment)
    total, used = np.zeros(frequency.size), 0
    for start in starts:
        part = series[start : start + segment]
        there = np.isfinite(part)
        if there.sum() < max(FEWEST_SAMPLES, segment // 4):
            continue
        away = part[there] - part[there].mean()
        power = lombscargle(time[there], weight[there] * away, 2 * np.pi * frequency[1:])
        total[1:] += power * 2 * interval / np.sum(weight[there] ** 2) * there.sum()
        used += 1
    if not used:
        raise InputError("every segment has fewer than a quarter of its samples; use longer ones")
    return frequency, total / used, used


def _variance_growth(window: str, segment: int, step: int, count: int) -> float:
    """How much more the mean of overlapping periodograms varies than that of separate ones."""
    from scipy.signal import get_window

    weight = get_window(window, segment)
    square, growth = np.sum(weight**2), 1.0
    for apart in range(1, count):
        if apart * step >= segment:
            break
        shared = np.sum(weight[apart * step :] * weight[: segment - apart * step])
        growth += 2 * (1 - apart / count) * (shared / square) ** 2
    return growth


def _band(density, freedom, confidence):
    from scipy.stats import chi2

    tail = (1 - confidence) / 2
    return density * freedom / chi2.ppf(1 - tail, freedom), density * freedom / chi2.ppf(tail, freedom)
