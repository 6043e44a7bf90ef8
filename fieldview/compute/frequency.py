"""The frequency that stands out in a series in time, and the Strouhal number made of it.

It is refined beyond the spacing of a spectrum by the sinusoid that fits all the samples best.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.numbers import Contribution, Number
from fieldview.compute.spectrum import FEWEST_SAMPLES, checked_series

_PADDING = 8
"""Times its own length a series is padded to, so that the top of a peak is not missed between two lines."""

_BROAD = 13.3
"""Sum of four squared scatters, in units of their variance, that a steady line exceeds once in a hundred."""


@dataclass(frozen=True)
class DominantFrequency:
    """The sinusoid that takes most of the variance.

    Attributes
    ----------
    frequency, uncertainty : float
        Standard uncertainty from what the sinusoid leaves near its own frequency. [1/time]
    amplitude : float
        [value]
    share : float
        Of the variance.
    chance : float
        Probability that noise without any line would show as high a peak somewhere.
    remarks : tuple of str
    """

    frequency: float
    uncertainty: float
    amplitude: float
    share: float
    chance: float
    remarks: tuple[str, ...] = ()


def dominant_frequency(
    values: np.ndarray, interval: float, *, band: tuple[float, float] | None = None
) -> DominantFrequency:
    """The sinusoid that fits a series best, by least squares over all its samples, gaps or not.

    Parameters
    ----------
    values : ndarray (N,)
        NaN where missing.
    interval : float
        [time]
    band : (float, float), optional
        Where to look; from one period in the series up to the Nyquist frequency if left out. [1/time]

    The uncertainty is that of the best unbiased estimate, sqrt(6 s^2 / N) / (pi T A), with s^2 / N from
    what the sinusoid leaves in the spectrum next to it. Where quarters of the series disagree by more than a
    steady line can, the peak is broad and the uncertainty is their scatter.
    Source: Rife & Boorstyn (1974) IEEE Trans. Inf. Theory 20:591-598 (from memory).
    """
    series = checked_series(values, interval)
    there = np.isfinite(series)
    time = (interval * np.arange(series.size))[there]
    away = series[there] - series[there].mean()
    variance = np.mean(away**2)
    if variance == 0:
        raise InputError("the series is constant, so it has no frequency")
    length = interval * series.size
    low, high = band if band is not None else (1 / length, 0.5 / interval)
    if not 0 < low < high <= 0.5 / interval * (1 + 1e-12):
        raise InputError(
            f"the band {low:g} to {high:g} is not between 0 and the Nyquist frequency {0.5 / interval:g}"
        )
    best = _best(series, interval, low, high)
    share, amplitude, rest = _fit(time, away, best)
    uncertainty = math.sqrt(6 * _level_near(time, rest, best, length)) / (math.pi * length * amplitude)
    chance = _chance(share, time, high - low)
    remarks = _remarks(best, length, chance, low, high)
    scatter = _scatter_of_quarters(series, interval, best, uncertainty)
    if scatter is not None:
        uncertainty = scatter
        remarks += ("the peak is broad: its uncertainty is the scatter between quarters of the series",)
    return DominantFrequency(best, float(uncertainty), amplitude, share, chance, remarks)


def _best(series, interval, low, high) -> float:
    """Frequency of the least-squares sinusoid: the top of a padded transform, refined over the samples."""
    there = np.isfinite(series)
    away = np.where(there, series - series[there].mean(), 0.0)
    size = 1 << math.ceil(math.log2(_PADDING * series.size))
    frequency = np.fft.rfftfreq(size, interval)
    inside = (frequency >= low) & (frequency <= high)
    if not inside.any():
        inside[np.argmin(np.abs(frequency - 0.5 * (low + high)))] = True
    start = frequency[inside][np.argmax(np.abs(np.fft.rfft(away, size))[inside])]
    return _refined(interval * np.flatnonzero(there), away[there], start, 2 * frequency[1], (low, high))


def _refined(time, away, start, reach, band) -> float:
    from scipy.optimize import minimize_scalar

    bounds = (max(band[0], start - reach), min(band[1], start + reach))
    if not bounds[0] < bounds[1]:
        return float(start)
    found = minimize_scalar(
        lambda f: -_fit(time, away, f)[0], bounds=bounds, method="bounded", options={"xatol": 1e-7 * reach}
    )
    return float(found.x)


def _fit(time, away, frequency) -> tuple[float, float, np.ndarray]:
    """Share of the variance, amplitude and what is left of the least-squares sinusoid with a constant."""
    angle = 2 * np.pi * frequency * time
    basis = np.stack([np.cos(angle), np.sin(angle), np.ones_like(time)], axis=1)
    weights = np.linalg.lstsq(basis.T @ basis, basis.T @ away, rcond=None)[0]
    rest = away - basis @ weights
    return 1 - float(rest @ rest / (away @ away)), float(np.hypot(*weights[:2])), rest


def _level_near(time, rest, frequency, length) -> float:
    """s^2 / N of the residual next to a frequency."""
    offsets = np.concatenate([np.arange(-4, -0.9, 0.5), np.arange(1, 4.1, 0.5)]) / length
    near = frequency + offsets[(frequency + offsets > 0.5 / length)]
    # an amplitude fitted to white noise of variance s^2 has the mean square 4 s^2 / N
    squares = [_fit(time, rest, f)[1] ** 2 for f in near]
    white = np.mean(rest**2) / max(time.size - 5, 1)
    return max(float(np.mean(squares)) / 4, 0.25 * white)


def _scatter_of_quarters(series, interval, best, uncertainty) -> float | None:
    """Standard deviation of the frequencies of four quarters, where it is too large for a steady line.

    None where it is not, or where a quarter holds too little to tell.
    """
    quarter = series.size // 4
    length = interval * quarter
    parts = [series[k * quarter : (k + 1) * quarter] for k in range(4)]
    if best * length < 3 or any(np.isfinite(part).sum() < 2 * FEWEST_SAMPLES for part in parts):
        return None
    reach = (max(0.5 * best, 1 / length), min(1.5 * best, 0.5 / interval))
    found = [_best(part, interval, *reach) for part in parts]
    # a line is found in a quarter of the time with 4^(3/2) times the uncertainty
    spread = float(np.sum((np.array(found) - best) ** 2) / (8 * uncertainty) ** 2)
    return float(np.sqrt(np.mean((np.array(found) - best) ** 2))) if spread > _BROAD else None


def _chance(share: float, time: np.ndarray, width: float) -> float:
    """Of white noise reaching this share of the variance at any frequency of a band this wide.

    Source: Baluev (2008) Mon. Not. R. Astron. Soc. 385:1279-1285 (from memory).
    """
    samples = time.size
    left = max(1 - share, 1e-300)
    single = left ** (0.5 * (samples - 3))
    gamma = math.exp(math.lgamma(0.5 * (samples - 1)) - math.lgamma(0.5 * (samples - 2)))
    gamma *= math.sqrt(2 / (samples - 1))
    extent = width * math.sqrt(4 * math.pi * float(np.var(time)))
    crossings = gamma * extent * left ** (0.5 * (samples - 4)) * math.sqrt(0.5 * (samples - 1) * share)
    return float(-math.expm1(math.log1p(-min(single, 1 - 1e-16)) - crossings))


def _remarks(frequency, length, chance, low, high) -> tuple[str, ...]:
    remarks = []
    if frequency * length < 3:
        remarks.append(f"the series holds only {frequency * length:.1f} periods of it")
    if min(frequency - low, high - frequency) < 0.1 / length:
        remarks.append("it lies at the end of the band looked at, so it may be no peak at all")
    if chance > 0.05:
        remarks.append(f"noise alone would show such a peak with probability {chance:.2g}")
    return tuple(remarks)


def strouhal(
    frequency: DominantFrequency,
    *,
    length: float,
    length_name: str,
    velocity: float,
    u_length: float | None = None,
    u_velocity: float | None = None,
) -> Number:
    """Strouhal number f L / U with its budget; an uncertainty that is not stated stays None in it.

    Parameters
    ----------
    frequency : DominantFrequency
        [1/time]
    length, u_length : float
        Length it is based on, and its standard uncertainty. [length]
    length_name : str
        What that length is, such as "chord"; it names its part of the budget.
    velocity, u_velocity : float
        [velocity]
    """
    for name, value in (("length", length), ("velocity", velocity)):
        if not value > 0:
            raise InputError(f"the {name} of the Strouhal number is {value}; give a positive one")
    if not length_name.strip():
        raise InputError("the length of a Strouhal number needs a name, such as chord or diameter")
    value = frequency.frequency * length / velocity
    return Number(
        value,
        "1",
        (
            _part("frequency", "random", length / velocity, frequency.uncertainty),
            _part(length_name, "systematic", value / length, u_length),
            _part("velocity", "systematic", -value / velocity, u_velocity),
        ),
    )


def _part(name, kind, sensitivity, uncertainty) -> Contribution:
    known = None if uncertainty is None else abs(sensitivity) * uncertainty
    return Contribution(name, kind, sensitivity, known)
