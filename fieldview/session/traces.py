"""A probe or a region over time: its trace, and what the trace says of means, periods and correlation."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.frequency import DominantFrequency, dominant_frequency, strouhal
from fieldview.compute.quantities import QUANTITIES, quantity
from fieldview.compute.region import measure_region
from fieldview.compute.spectrum import FEWEST_SAMPLES, Spectrum, spectrum
from fieldview.compute.time_series import Convergence, autocorrelation, convergence
from fieldview.files import UnreadableFrame
from fieldview.session.clock import Clock
from fieldview.session.measure import NUMBERS, number_row, region_named
from fieldview.session.statistics import frame_numbers
from fieldview.session.wording import figure, known_number


@dataclass(frozen=True, eq=False)
class Trace:
    """One number of every frame.

    Attributes
    ----------
    label, unit : str
    frames : int ndarray (N,)
    times : ndarray (N,)
        NaN where not known. [s]
    values : ndarray (N,)
        NaN where the frame has none. [unit]
    uncertainties : ndarray (N,) or None
        Random standard uncertainty of each, where there is one. [unit]
    interval : float or None
        Between frames; None where the times are unknown or uneven. [s]
    remarks : tuple of str
    unread : tuple of str
        A sentence for every frame that could not be read, which has no value then.
    """

    label: str
    unit: str
    frames: np.ndarray
    times: np.ndarray
    values: np.ndarray
    uncertainties: np.ndarray | None
    interval: float | None
    remarks: tuple[str, ...] = ()
    unread: tuple[str, ...] = ()

    @property
    def missing(self) -> int:
        return int(np.count_nonzero(~np.isfinite(self.values)))

    @property
    def step(self) -> float:
        """Interval [s], or 1 [frame] where it is not known."""
        return 1.0 if self.interval is None else self.interval

    def convergence(self) -> Convergence:
        """Mean and standard deviation over the first n frames."""
        return convergence(self.values)

    def spectrum(self, **options) -> Spectrum:
        """Power spectral density, see `fieldview.compute.spectrum.spectrum`. [unit^2 s]"""
        return spectrum(self.values, self.step, **options)

    def dominant_frequency(self, *, band: tuple[float, float] | None = None) -> DominantFrequency:
        """[1/s], or [1/frame] where the interval is not known."""
        return dominant_frequency(self.values, self.step, band=band)


def probe_trace(
    bench,
    point: tuple[float, float],
    name: str,
    frames: Iterable[int] | str | None = None,
    *,
    on_frame: Callable[[int], None] | None = None,
) -> Trace:
    """A quantity at a point of the plane, bilinear between its four nodes; NaN where one of them has none.

    Raises
    ------
    InputError
        The quantity is not known, or the point lies outside the grid.
    """
    if name not in QUANTITIES:
        raise InputError(f'quantity "{name}" is not known; the quantities are: {", ".join(QUANTITIES)}')

    def value(field: Field):
        return _between(field, quantity(field, name), point), None

    unit = QUANTITIES[name].unit(bench.units)
    label = f"{name} at ({figure(point[0])}, {figure(point[1])})"
    return _trace(bench, frames, value, label, unit, on_frame)


def region_trace(
    bench,
    region: str,
    number: str = "circulation",
    frames: Iterable[int] | str | None = None,
    *,
    on_frame: Callable[[int], None] | None = None,
) -> Trace:
    """One number of a region of the session over time; NaN where it cannot be had.

    Raises
    ------
    InputError
        There is no such region, or no such number of it.
    """
    chosen = region_named(bench.session, region)
    if number not in NUMBERS:
        raise InputError(f'a region has no number "{number}"; it has: {", ".join(NUMBERS)}')
    units: list[str] = []

    def value(field: Field):
        found = getattr(measure_region(field, chosen.outline(), line=bench.session.line), NUMBERS[number])
        if found is None:
            raise InputError(f'region "{region}" has no {number} in this run')
        units.append(found.unit)
        return found.value, found.random

    trace = _trace(bench, frames, value, f"{number} of {region}", "", on_frame)
    return Trace(**{**trace.__dict__, "unit": units[0]})


def _trace(bench, frames, value, label, unit, on_frame) -> Trace:
    numbers = frame_numbers(bench, frames)
    clock, unread = Clock(), []
    times, values, spreads = (np.full(len(numbers), np.nan) for _ in range(3))
    for place, frame in enumerate(numbers):
        try:
            field = bench.field(frame)
        except UnreadableFrame as error:
            unread.append(f"frame {frame} was skipped: {error}")
            if len(unread) == len(numbers):
                raise
            clock.skip()
        else:
            clock.add(field.time)
            times[place] = np.nan if field.time is None else field.time
            found, spread = value(field)
            values[place] = np.nan if found is None else found
            spreads[place] = np.nan if spread is None else spread
        if on_frame is not None:
            on_frame(frame)
    return Trace(
        label,
        unit,
        np.array(numbers),
        times,
        values,
        spreads if np.isfinite(spreads).any() else None,
        clock.interval,
        tuple(clock.remarks()),
        tuple(unread),
    )


def _between(field: Field, values: np.ndarray, point: tuple[float, float]) -> float:
    """Bilinear value at a point of the plane."""
    grid = field.grid
    place = complex(grid.placement.to_lattice(complex(*point)))
    found = 0.0
    corners = []
    for axis, at, name in ((grid.y, place.imag, "y"), (grid.x, place.real, "x")):
        if not axis[0] <= at <= axis[-1]:
            raise InputError(
                f"the probe ({figure(point[0])}, {figure(point[1])}) lies outside the grid along {name}"
            )
        low = int(np.clip(np.searchsorted(axis, at, side="right") - 1, 0, max(axis.size - 2, 0)))
        share = 0.0 if axis.size == 1 else (at - axis[low]) / (axis[low + 1] - axis[low])
        corners.append([(low, 1 - share), (low + 1, share)])
    for iy, weight_y in corners[0]:
        for ix, weight_x in corners[1]:
            # a corner without weight need not be measured, nor even exist
            if weight_y * weight_x:
                found += weight_y * weight_x * values[iy, ix]
    return float(found)


def trace_row(
    trace: Trace,
    *,
    band: tuple[float, float] | None = None,
    length: float | None = None,
    length_name: str = "",
    velocity: float | None = None,
    u_length: float | None = None,
    u_velocity: float | None = None,
) -> dict:
    """What a trace says, in strict JSON: mean, deviation, time scale, dominant frequency, Strouhal number.

    Parameters
    ----------
    trace : Trace
    band : (float, float), optional
        Where the dominant frequency is looked for.
    length, length_name, velocity, u_length, u_velocity : optional
        For the Strouhal number, which is left out without a length and a velocity.
    """
    there = trace.values[np.isfinite(trace.values)]
    row = {
        "label": trace.label,
        "frames": int(trace.values.size),
        "missing": trace.missing,
        "interval": trace.interval,
        "remarks": [*trace.remarks, *trace.unread],
    }
    if there.size < FEWEST_SAMPLES or np.ptp(there) == 0:
        why = f"only {there.size} values" if there.size < FEWEST_SAMPLES else "it never changes"
        row["remarks"].append(f"{why}: no uncertainty, time scale or frequency")
        row["mean"] = _with(float(there.mean()) if there.size else None, trace.unit, None)
        return row
    curve = trace.convergence()
    time = "frame" if trace.interval is None else "s"
    correlation = autocorrelation(trace.values)
    found = trace.dominant_frequency(band=band)
    row |= {
        "mean": _with(curve.mean[-1], trace.unit, curve.mean_uncertainty[-1]),
        "deviation": _with(curve.deviation[-1], trace.unit, curve.deviation_uncertainty[-1]),
        "integral_time": _with(trace.step * correlation.integral_scale, time, None),
        "effective_samples": correlation.effective_number(there.size),
        "dominant_frequency": _with(found.frequency, "Hz" if time == "s" else "1/frame", found.uncertainty)
        | {"amplitude": found.amplitude, "share": found.share, "chance": found.chance},
    }
    if correlation.zero is None:
        row["remarks"].append("the autocorrelation does not fall to zero: uncertainties are lower bounds")
    row["remarks"] += found.remarks
    if length is not None and velocity is not None:
        if time != "s":
            raise InputError("a Strouhal number needs the times of the frames; state the frame interval")
        number = strouhal(
            found,
            length=length,
            length_name=length_name,
            velocity=velocity,
            u_length=u_length,
            u_velocity=u_velocity,
        )
        unknown = [part.name for part in number.budget if part.uncertainty is None]
        row["strouhal"] = number_row(number) | {"length_name": length_name, "not_stated": unknown}
    return row


TITLES = {
    "mean": "mean",
    "deviation": "standard deviation",
    "integral_time": "integral time scale",
    "dominant_frequency": "dominant frequency",
}
"""Parts of `trace_row` that are a value with its uncertainty, in words."""


def strouhal_options(bench, trace: Trace) -> dict:
    """What `trace_row` needs for a Strouhal number on the session's reference length and velocity, if any."""
    stated = bench.session.reference
    known = trace.interval is not None and str(bench.units) == "m, s"
    if stated.length is None or stated.velocity is None or not known:
        return {}
    return {
        "length": stated.length,
        "length_name": stated.length_name or "reference length",
        "velocity": stated.velocity,
        "u_length": stated.u_length,
        "u_velocity": stated.u_velocity,
    }


def _with(value, unit: str, uncertainty) -> dict:
    return {"value": known_number(value), "unit": unit, "uncertainty": known_number(uncertainty)}
