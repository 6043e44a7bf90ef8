"""Statistics of a run as maps, each with the standard uncertainty that the number of its samples leaves."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations_with_replacement

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.lag_window import LAGS, Correlation, LagWindow, Thinning
from fieldview.compute.moments import Moments
from fieldview.compute.units import Units

FEW_SAMPLES = 10
"""Independent samples below which an uncertainty made of them is hardly one."""

_NOISE_OFF = "variance of the random errors taken off; how uncertain sigma is itself is not included"


@dataclass(frozen=True, eq=False)
class StatisticMap:
    """One statistic at every node.

    Attributes
    ----------
    name, title : str
    values : ndarray (ny, nx)
        NaN where there are too few samples. [velocity^power]
    uncertainty : ndarray (ny, nx) or None
        Standard uncertainty from the finite, correlated sample; None for plain counts.
    power : int
        Of the velocity in its unit; 0 is a pure number.
    remarks : tuple of str
        What is to be known about it.
    own_unit : str
        Unit of what is no power of velocity; "" otherwise.
    """

    name: str
    title: str
    values: np.ndarray
    uncertainty: np.ndarray | None
    power: int
    remarks: tuple[str, ...] = ()
    own_unit: str = ""

    def unit(self, units: Units) -> str:
        return self.own_unit or units.of(self.power, -self.power)


class FrameStatistics:
    """Moments and lag window of a run together, filled frame by frame in order of time.

    Parameters
    ----------
    names : sequence of str
        Components.
    shape : (int, int)
    lags : int
        Longest lag of the autocorrelation. [frames]
    """

    def __init__(self, names, shape: tuple[int, int], *, lags: int = LAGS):
        self.names = tuple(names)
        self.moments = Moments(self.names, shape)
        self.thinning = Thinning(shape)
        self.lag_window = LagWindow(self.names, self.thinning.size, lags=lags)

    def add(self, parts, *, noise_variance=None) -> None:
        """The next frame, arguments as of `Moments.add`; a frame that could not be read is all NaN."""
        self.moments.add(parts, noise_variance=noise_variance)
        values = [np.asarray(parts[name], float) for name in self.names]
        valid = np.logical_and.reduce([np.isfinite(part) for part in values])
        thinned = [self.thinning.thin(np.where(valid, part, np.nan)) for part in values]
        self.lag_window.add(dict(zip(self.names, thinned, strict=True)))

    def merge(self, later: FrameStatistics) -> None:
        """The statistics of the frames that follow directly in time."""
        self.moments.merge(later.moments)
        self.lag_window.merge(later.lag_window)

    def correlation(self) -> Correlation:
        """Autocorrelation at the chosen nodes, most of the bias of a finite run taken off."""
        means = {name: self.thinning.thin(self.moments.mean(name)) for name in self.names}
        return self.lag_window.correlation(means).corrected(self.thinning.thin(self.moments.count))


def statistic_maps(
    run: FrameStatistics, *, interval: float | None = None, subtract_noise: bool = False
) -> dict[str, StatisticMap]:
    """Every statistic of a run by name.

    With N samples, s the standard deviation and kappa the kurtosis, standard uncertainties are: mean
    s / sqrt(N_eff); standard deviation s sqrt((kappa - 1) / (4 N_2)); stress u'v'
    sqrt((<u'^2 v'^2> - <u'v'>^2) / N_uv); skewness sqrt(6 / N_3) and kurtosis sqrt(24 / N_4), those two as
    of a normal process (Lomnicki 1961, from memory). N_eff = N / (1 + 2 sum rho), N_2, N_3, N_4 with
    the powers of rho, N_uv with the product of both. The integral time scale is interval (1/2 + sum rho).

    Parameters
    ----------
    run : FrameStatistics
    interval : float, optional
        Time between samples; without it times are in frames. [s]
    subtract_noise : bool
        Take the variance of the random errors off the normal stresses and what is made of them. Errors of
        different components are independent, so shear stresses keep theirs.

    Returns
    -------
    dict of str to StatisticMap
        mean_u, std_u, skewness_u, kurtosis_u, integral_time_u, effective_samples_u for each component;
        reynolds_uu, reynolds_uv, ...; tke; count.

    Raises
    ------
    InputError
        The noise is to be taken off and is not known.
    """
    worth = _Worth(run)
    made = [_count(run)]
    noise = {name: run.moments.noise_variance(name) for name in run.names} if subtract_noise else {}
    if any(np.isnan(part[run.moments.count > 0]).any() for part in noise.values()):
        raise InputError(
            "the noise cannot be taken off the Reynolds stresses: no sigma is stated; give one or "
            '"estimate" in the error model'
        )
    for name in run.names:
        made += _of_component(run, worth, name, noise.get(name), interval)
    for first, second in combinations_with_replacement(run.names, 2):
        made.append(_stress(run, worth, first, second, noise))
    made.append(_energy(run, worth, noise))
    return {entry.name: entry for entry in made}


class _Worth:
    """Effective number of samples at every node, by the statistic it is for."""

    def __init__(self, run: FrameStatistics):
        self._run, self._correlation = run, run.correlation()
        self._known: dict[tuple[str, ...], np.ndarray] = {}

    def inflation(self, *names: str) -> np.ndarray:
        if names not in self._known:
            self._known[names] = self._run.thinning.spread(self._correlation.inflation(*names))
        return self._known[names]

    def samples(self, *names: str) -> np.ndarray:
        """N_eff (ny, nx); NaN where the correlation in time is nowhere known."""
        return self._run.moments.count / self.inflation(*names)

    def remarks(self, *names: str) -> tuple[str, ...]:
        known = np.logical_and.reduce([self._correlation.known(name) for name in names])
        if not known.any():
            return ("too few frames to tell how far they are correlated: no uncertainty",)
        ends = np.logical_and.reduce([self._correlation.falls_to_zero(name) for name in names])
        said, open_share = (), 1 - ends[known].mean()
        some = self._run.moments.count > 1
        few = np.mean(self.samples(*names)[some] < FEW_SAMPLES) if some.any() else 0.0
        if few > 0:
            said += (
                f"at {100 * few:.1f} % of the nodes there are fewer than {FEW_SAMPLES} independent samples: "
                "the uncertainty there is itself uncertain by half and more",
            )
        if open_share == 0:
            return said
        return (
            *said,
            f"at {100 * open_share:.1f} % of the nodes the autocorrelation does not fall to zero within "
            f"{self._run.lag_window.lags} frames: the uncertainty there is a lower bound",
        )


def _count(run):
    return StatisticMap("count", "Number of samples", run.moments.count.astype(float), None, 0)


def _of_component(run, worth, name, noise, interval):
    moments = run.moments
    deviation = total = moments.deviation(name)
    kurtosis = moments.kurtosis(name)
    remarks, noise_remarks = worth.remarks(name), ()
    if noise is not None:
        deviation, noise_remarks = _without_noise(total, noise)
    with np.errstate(divide="ignore", invalid="ignore"):
        spread = total**2 * np.sqrt((kurtosis - 1) / worth.samples(name, name))
        u_deviation = np.where(deviation > 0, 0.5 * spread / deviation, np.nan)
        third, fourth = (np.sqrt(f / worth.samples(*(name,) * k)) for f, k in ((6, 3), (24, 4)))
    varies = total > 0  # a node that never changes has no shape of distribution
    scale = 0.5 * worth.inflation(name) * (interval or 1.0)
    time_unit = "frame" if interval is None else "s"
    spread_remarks = (*remarks, *noise_remarks)
    entries = (
        ("mean", "Mean", moments.mean(name), total / np.sqrt(worth.samples(name)), 1, remarks),
        ("std", "Standard deviation", deviation, np.where(total == 0, 0.0, u_deviation), 1, spread_remarks),
        ("skewness", "Skewness", moments.skewness(name), np.where(varies, third, np.nan), 0, remarks),
        ("kurtosis", "Kurtosis (normal: 3)", kurtosis, np.where(varies, fourth, np.nan), 0, remarks),
        ("integral_time", "Integral time scale", scale, None, 0, remarks, time_unit),
        ("effective_samples", "Independent samples", worth.samples(name), None, 0, remarks),
    )
    return [StatisticMap(f"{key}_{name}", f"{title} of {name}", *rest) for key, title, *rest in entries]


def _without_noise(deviation, noise):
    square = deviation**2 - noise
    below = int(np.count_nonzero(square < 0))
    remarks = (_NOISE_OFF,)
    if below:
        remarks += (
            f"at {below} nodes the stated noise is larger than the whole fluctuation: no value there",
        )
    return np.sqrt(np.where(square >= 0, square, np.nan)), remarks


def _stress(run, worth, first, second, noise):
    moments = run.moments
    values = moments.covariance(first, second)
    spread = moments.central(first, first, second, second) - moments.central(first, second) ** 2
    uncertainty = np.sqrt(np.maximum(spread, 0.0) / worth.samples(first, second))
    remarks = worth.remarks(first, second)
    if first == second and noise:
        # kept where it comes out negative: cutting it off would bias every mean over nodes
        values = values - noise[first]
        below = int(np.count_nonzero(values < 0))
        remarks += (_NOISE_OFF,)
        if below:
            remarks += (f"negative at {below} nodes: the stated noise is larger than the fluctuation there",)
    title = f"Reynolds stress {first}′{second}′"
    return StatisticMap(f"reynolds_{first}{second}", title, values, uncertainty, 2, remarks)


def _energy(run, worth, noise):
    """Half the sum of the normal stresses measured; their estimates' covariance is followed."""
    moments, names = run.moments, run.names
    values = 0.5 * sum(moments.covariance(name, name) - noise.get(name, 0.0) for name in names)
    variance = 0.0
    for first, second in combinations_with_replacement(names, 2):
        joint = moments.central(first, first, second, second)
        joint = joint - moments.central(first, first) * moments.central(second, second)
        twice = 1.0 if first == second else 2.0
        # u'^2 and v'^2 follow each other in time as the product of both correlations, at most
        variance = variance + 0.25 * twice * joint / worth.samples(first, second)
    of = " + ".join(f"{name}′{name}′" for name in names)
    remarks = (f"half of {of}, the components measured", *worth.remarks(*names))
    return StatisticMap(
        "tke", "Turbulent kinetic energy per mass", values, np.sqrt(np.maximum(variance, 0.0)), 2, remarks
    )
