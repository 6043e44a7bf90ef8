"""The outputs of ``loopflux series``, ``cycle``, ``modes`` and ``correlate``: a run over its time."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from fieldview.compute.field import Field
from fieldview.compute.spectrum import FEWEST_SAMPLES
from fieldview.compute.time_series import autocorrelation
from fieldview.publish import wording
from fieldview.publish.maps import Values, check_ending, write_maps
from fieldview.publish.measuring import Progress
from fieldview.publish.outputs import as_text
from fieldview.publish.remarks import Remarks
from fieldview.session.modes import run_modes, two_point
from fieldview.session.phase import phase_averages
from fieldview.session.replay import Workbench
from fieldview.session.statistics import frame_numbers
from fieldview.session.store import load_session
from fieldview.session.traces import TITLES, Trace, probe_trace, region_trace, strouhal_options, trace_row


@dataclass(frozen=True)
class Request:
    """What every one of these outputs is asked with.

    Attributes
    ----------
    path : Path
        Of the session.
    frames : str or None
    format : "table", "csv" or "json"
    progress : Progress
    say : callable (sentence)
        Told every changed source and every frame that could not be used.
    """

    path: Path
    frames: str | None
    format: str
    progress: Progress
    say: Callable[[str], None]

    def begin(self, what: str) -> tuple[Workbench, list[int], Callable[[int], None], Remarks]:
        """The workbench, the frames' numbers, what is to be told of every frame done, and the remarks."""
        bench = Workbench(load_session(self.path))
        remarks = Remarks(self.say, bench)
        numbers = frame_numbers(bench, self.frames)
        ticks = iter(self.progress(numbers, what, len(numbers)))
        next(ticks, None)
        return bench, numbers, lambda _: next(ticks, None), remarks

    def told(self, document: dict, rows: Iterable[dict], lines: Iterable[str]) -> str:
        """The same in the format that was asked for."""
        return as_text(self.format, {"session": self.path.name} | document, rows, lines)


def series_report(
    request: Request,
    *,
    point: tuple[float, float] | None,
    quantity: str,
    region: str | None,
    number: str,
    band: tuple[float, float] | None,
) -> tuple[str, bool]:
    """A probe's quantity or a region's number over time, with its spectrum; and whether to remark anything.

    The table tells what the series says; csv is the series itself, json holds both and the spectrum,
    autocorrelation and convergence.
    """
    bench, numbers, tick, remarks = request.begin("measuring")
    if region is not None:
        trace = region_trace(bench, region, number, numbers, on_frame=tick)
    else:
        trace = probe_trace(bench, point, quantity, numbers, on_frame=tick)
    for sentence in trace.unread:
        request.say(sentence)
    row = trace_row(trace, band=band, **strouhal_options(bench, trace))
    samples = _samples(trace)
    document = row | {"samples": samples, "spectrum": _spectrum(trace), "correlation": _correlation(trace)}
    text = request.told(document, samples, _series_lines(row, trace))
    return text, bool(remarks or trace.unread)


def _samples(trace: Trace) -> list[dict]:
    curve = trace.convergence()
    spreads = trace.uncertainties if trace.uncertainties is not None else [None] * trace.values.size
    columns = zip(
        trace.frames, trace.times, trace.values, spreads, curve.mean, curve.mean_uncertainty, strict=True
    )
    return [
        {
            "frame": int(frame),
            "time": time,
            "value": value,
            "random": spread,
            "unit": trace.unit,
            "mean_so_far": mean,
            "mean_uncertainty": width,
        }
        for frame, time, value, spread, mean, width in columns
    ]


def _enough(trace: Trace) -> bool:
    there = trace.values[np.isfinite(trace.values)]
    return there.size >= FEWEST_SAMPLES and np.ptp(there) > 0


def _spectrum(trace: Trace) -> dict | None:
    if not _enough(trace):
        return None
    found = trace.spectrum()
    time = "s" if trace.interval is not None else "frame"
    return {
        "method": found.method,
        "segments": found.segments,
        "missing": found.missing,
        "confidence": found.confidence,
        "frequency_unit": f"1/{time}",
        "density_unit": f"({trace.unit})^2 {time}",
        "frequency": found.frequency.tolist(),
        "density": found.density.tolist(),
        "low": found.low.tolist(),
        "high": found.high.tolist(),
    }


def _correlation(trace: Trace) -> dict | None:
    if not _enough(trace):
        return None
    found = autocorrelation(trace.values)
    lags = np.arange(found.rho.size) * trace.step
    unit = "s" if trace.interval is not None else "frame"
    return {"lag_unit": unit, "lag": lags.tolist(), "rho": found.rho.tolist(), "pairs": found.pairs.tolist()}


def _series_lines(row: dict, trace: Trace) -> Iterator[str]:
    yield f"{row['label']}: {row['frames']} frames, {row['missing']} without a value"
    yield ""
    for key, title in TITLES.items():
        if key in row:
            part = row[key]
            yield f"  {title:<22} {wording.plus_minus(part['value'], part['uncertainty'], part['unit'])}"
    if "dominant_frequency" in row:
        found = row["dominant_frequency"]
        amplitude = f"{wording.short(found['amplitude'])} {wording.unit_text(trace.unit)}".rstrip()
        yield (
            f"  {'':<22} amplitude {amplitude}, {wording.percent(found['share'])} of the variance, "
            f"by chance {wording.percent(found['chance'])}"
        )
        yield f"  {'independent samples':<22} {wording.short(row['effective_samples'])}"
    if "strouhal" in row:
        found = row["strouhal"]
        spread = found["uncertainty"]["combined"]
        yield (
            f"  {'Strouhal number':<22} {wording.plus_minus(found['value'], spread, found['unit'])} "
            f"on the {found['length_name']}"
        )
        if found["not_stated"]:
            yield f"  {'':<22} not stated: {', '.join(found['not_stated'])}"
    yield ""
    yield from (f"  ! {sentence}" for sentence in row["remarks"])


def cycle_report(request: Request, bins: int, *, filled: bool) -> tuple[str, bool]:
    """The bins of the cycle: frames, width, jitter and what is smeared; and whether to remark anything."""
    bench, numbers, tick, remarks = request.begin("averaging")
    found = phase_averages(bench, bench.phase_rule(bins), numbers, filled=filled, on_frame=tick)
    rows = found.rows()
    return request.told({"bins": rows, "left_out": found.left_out}, rows, _cycle_lines(rows, found)), bool(
        remarks
    )


def _cycle_lines(rows: list[dict], found) -> Iterator[str]:
    yield "  bin  phase        frames  mean shift  jitter  of a variation once per cycle kept"
    for row in rows:
        width = f"{wording.short(row['phase_deg'])}° ± {wording.short(row['width_deg'] / 2)}°"
        yield (
            f"  {row['bin']:>3}  {width:<12} {row['frames']:>6}  {_degrees(row['shift_deg']):>10}  "
            f"{_degrees(row['jitter_deg']):>6}  {wording.percent(row['first_harmonic_kept'])}"
        )
    yield ""
    yield f"  ! {found.left_out} frames lie between the bins and are left out"
    drifts = [row["drift_deg"] for row in rows if row["drift_deg"] is not None]
    if drifts:
        yield f"  ! the uncertainty of the frequency is up to {_degrees(max(drifts))} of phase over a bin"


def _degrees(value: float | None) -> str:
    return "–" if value is None else f"{wording.short(round(value, 3), digits=2)}°"


def modes_report(request: Request, count: int, *, filled: bool, maps: Path | None) -> tuple[str, bool]:
    """Energy of the modes of a run; with ``maps`` the mean and every mode go to that file."""
    check_ending(maps)
    bench, numbers, tick, remarks = request.begin("modes")
    found = run_modes(bench, numbers, count=count, filled=filled, on_frame=tick)
    for sentence in found.unread:
        request.say(sentence)
    rows = found.rows()
    if maps is not None:
        write_maps(maps, found.mean_field(), _mode_values(found), session=request.path)
    document = {
        "frames": len(found.frames),
        "modes": rows,
        "coefficients": found.modes.coefficients.tolist(),
        "remarks": found.remarks(),
    }
    return request.told(document, rows, _mode_lines(rows, found)), bool(remarks or found.unread)


def _mode_values(found) -> Values:
    values: Values = {}
    for number in range(1, len(found.modes.modes) + 1):
        shape: Field = found.mode_field(number)
        for name, part in shape.components.items():
            values[f"mode_{number}_{name}"] = (part, shape.units.velocity)
    return values


def _mode_lines(rows: list[dict], found) -> Iterator[str]:
    yield f"{len(found.frames)} frames; energy is the mean square of a mode's coefficient"
    yield ""
    for row in rows:
        energy = row["energy"]
        shown = wording.plus_minus(energy["value"], energy["uncertainty"], energy["unit"])
        mixed = "" if row["apart"] else "   not clear of its neighbours"
        yield (
            f"  mode {row['mode']:>2}  {shown:<34} {wording.percent(row['share']):>6}  "
            f"{wording.percent(row['cumulative']):>6} so far{mixed}"
        )
    yield ""
    yield from (f"  ! {sentence}" for sentence in found.remarks())


def correlation_report(
    request: Request, *, point: tuple[float, float], first: str, second: str | None, maps: Path | None
) -> tuple[str, bool]:
    """Correlation about a node and its integral lengths; with ``maps`` the coefficient goes to that file."""
    check_ending(maps)
    bench, numbers, tick, remarks = request.begin("correlating")
    found, lengths, grid = two_point(bench, point, first, second, numbers, on_frame=tick)
    node = grid.nodes[found.node]
    rows = [
        {"along": along, "length": length.length, "uncertainty": length.uncertainty, "ends": length.ends}
        | {"unit": bench.units.of(1)}
        for along, length in lengths.items()
    ]
    if maps is not None:
        values = {
            "correlation": (found.coefficient(), "1"),
            "correlation_uncertainty": (found.uncertainty(), "1"),
            "samples": (found.count.astype(float), "1"),
        }
        write_maps(maps, bench.field(numbers[0]), values, session=request.path)
    what = f"{first} with {second or first}"
    document = {
        "correlation": what,
        "node": list(found.node),
        "place": [float(node.real), float(node.imag)],
        "samples": int(found.count[found.node]),
        "lengths": rows,
    }
    lines = [
        f"{what} about ({wording.short(node.real)}, {wording.short(node.imag)}), "
        f"{document['samples']} frames taken as independent",
        "",
    ]
    ends = {"edge": "  at least: the grid ends before it is zero", "gap": "  at least: a gap ends it"}
    lines += [
        f"  integral length {row['along']}  "
        f"{wording.plus_minus(row['length'], row['uncertainty'], row['unit'])}{ends.get(row['ends'], '')}"
        for row in rows
    ]
    return request.told(document, rows, lines), bool(remarks)
