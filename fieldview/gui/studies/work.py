"""The background work of the sheets on the whole run: headless functions, followed and cancellable."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from fieldview.compute.grid import Grid
from fieldview.session.models import Session

Report = Callable[[float], None]


def _ticks(report: Report, total: int) -> Callable[[int], None]:
    """A function to be called once for every frame done."""
    done = 0

    def tick(_: int) -> None:
        nonlocal done
        done += 1
        report(done / max(total, 1))

    return tick


def check(bench: Any, session: Session, report: Report):
    """The run check over all frames; those that cannot be used are in its findings."""
    from fieldview.session.check import run_check

    bench = bench.updated(session)
    return run_check(bench, on_skip=lambda *_: None, on_frame=_ticks(report, len(bench.run)))


@dataclass(frozen=True, eq=False)
class Series:
    """A trace and all that is made of it; what a short or steady one does not give is None."""

    trace: Any
    row: dict
    spectrum: Any
    correlation: Any
    convergence: Any


def series(
    bench: Any, session: Session, place: tuple | None, name: str, region: str, report: Report
) -> Series:
    """A probe's quantity (with a place) or a region's number over the run."""
    from fieldview.compute.spectrum import FEWEST_SAMPLES
    from fieldview.compute.time_series import autocorrelation
    from fieldview.session.traces import probe_trace, region_trace, strouhal_options, trace_row

    bench = bench.updated(session)
    tick = _ticks(report, len(bench.run))
    if place is not None:
        trace = probe_trace(bench, place, name, on_frame=tick)
    else:
        trace = region_trace(bench, region, name, on_frame=tick)
    there = trace.values[np.isfinite(trace.values)]
    enough = there.size >= FEWEST_SAMPLES and np.ptp(there) > 0
    return Series(
        trace,
        trace_row(trace, **strouhal_options(bench, trace)),
        trace.spectrum() if enough else None,
        autocorrelation(trace.values) if enough else None,
        trace.convergence(),
    )


@dataclass(frozen=True, eq=False)
class Statistics:
    """Every statistic of the run as a map."""

    grid: Grid
    maps: dict
    units: dict[str, str]
    remarks: tuple[str, ...]


def statistics(bench: Any, session: Session, subtract_noise: bool, report: Report) -> Statistics:
    from fieldview.session.statistics import run_statistics

    bench = bench.updated(session)
    tick = _ticks(report, len(bench.run))
    run = run_statistics(bench, on_skip=lambda *_: None, on_frame=tick)
    maps = run.maps(subtract_noise=subtract_noise)
    mean = run.mean
    units = {name: entry.unit(mean.units) for name, entry in maps.items()}
    return Statistics(mean.grid, maps, units, tuple(run.remarks()))


def modes(bench: Any, session: Session, count: int, report: Report):
    from fieldview.session.modes import run_modes

    bench = bench.updated(session)
    return run_modes(bench, count=count, on_frame=_ticks(report, len(bench.run)))


@dataclass(frozen=True, eq=False)
class TwoPointMap:
    """A two-point correlation about a node."""

    grid: Grid
    rho: np.ndarray
    samples: int
    place: complex
    lengths: dict


def correlation(bench: Any, session: Session, place: tuple, component: str, report: Report) -> TwoPointMap:
    from fieldview.session.modes import two_point

    bench = bench.updated(session)
    tick = _ticks(report, len(bench.run))
    found, lengths, grid = two_point(bench, place, component, on_frame=tick)
    at = complex(grid.nodes[found.node])
    return TwoPointMap(grid, found.coefficient(), int(found.count[found.node]), at, lengths)


@dataclass(frozen=True, eq=False)
class Phases:
    """The bins of the cycle, the average of each (None where no frame falls into it) and its regions."""

    rows: list[dict]
    fields: list
    numbers: list[list[tuple[str, str, str]]]
    left_out: int


def phases(bench: Any, session: Session, bins: int, report: Report) -> Phases:
    from fieldview.session.phase import phase_averages

    bench = bench.updated(session)
    tick = _ticks(report, len(bench.run))
    found = phase_averages(bench, bench.phase_rule(bins), on_frame=tick)
    rows = found.rows()
    fields = [found.field(number) if row["frames"] else None for number, row in enumerate(rows)]
    numbers = [[] if field is None else _region_words(session, field) for field in fields]
    return Phases(rows, fields, numbers, found.left_out)


def _region_words(session: Session, field) -> list[tuple[str, str, str]]:
    """Name, symbol and first number of every region on a field."""
    from fieldview.publish import wording
    from fieldview.publish.region_numbers import symbol
    from fieldview.session.measure import NUMBERS, measure_field

    said = []
    for name, numbers in measure_field(session, field).items():
        for key, attribute in NUMBERS.items():
            number = getattr(numbers, attribute)
            if number is not None:
                shown = wording.plus_minus(number.value, number.combined, number.unit)
                said.append((name, symbol(key), shown))
                break
    return said


def comparison(
    bench: Any, session: Session, shown: int, other: Path | None, frame: str, shared: bool, report: Report
):
    """The other frame less the shown one."""
    from fieldview.publish.study_reports import one_frame
    from fieldview.session.comparison import compare
    from fieldview.session.replay import Workbench
    from fieldview.session.store import load_session

    own = bench.updated(session)
    report(0.1)
    theirs = own if other is None else Workbench(load_session(other))
    second = theirs.field(one_frame(theirs, frame))
    report(0.7)
    return compare(session, own.field(shown), second, shared_calibration=shared)


def repeated(bench: Any, session: Session, others: tuple[Path, ...], frames: str, report: Report) -> list:
    """Repeats over the frames of this run, or over one frame of this session and others."""
    from fieldview.publish.study_reports import one_frame
    from fieldview.session.measure import frame_row
    from fieldview.session.repeats import repeats
    from fieldview.session.replay import Workbench
    from fieldview.session.store import load_session

    own = bench.updated(session)
    if others:
        benches = [own, *(Workbench(load_session(path)) for path in others)]
        asked = [(bench, one_frame(bench, frames or "mean")) for bench in benches]
    else:
        asked = [(own, frame) for frame in own.frames(frames or None)]
    measured = {}
    for number, (bench, frame) in enumerate(asked):
        measured[str(number)] = frame_row(bench.session, frame, bench.field(frame))
        report((number + 1) / len(asked))
    return repeats(measured)


def choices(bench: Any, session: Session, region: str, frame: int, report: Report):
    from fieldview.publish.studies import choices_study

    return choices_study(bench.updated(session), region, frame, progress=_followed(report))


def report_file(bench: Any, session: Session, name: str, out: Path, report: Report) -> Path:
    """Write the measurement report of the session as it is now."""
    from fieldview.files.writing import said_if_unwritable, write_whole
    from fieldview.publish.report.writing import report_text

    text, _ = report_text(
        bench.updated(session),
        name,
        None,
        choices=False,
        progress=_followed(report),
        say=lambda _: None,
    )
    with said_if_unwritable(out):
        write_whole(out, text.encode())
    return out


def store(bench: Any, path: Path, report: Report) -> Path:
    """Keep the run in one binary file."""
    from fieldview.files import open_run
    from fieldview.files.stored import write_store

    source = bench.session.run
    run = open_run(source.files, source.reading, folder=bench.session.folder)
    write_store(run, path, on_frame=_ticks(report, len(run)))
    return path


def figure_preview(bench: Any, session: Session, settings, report: Report) -> bytes:
    """The figure as a picture for the screen, by the very function that writes it."""
    from fieldview.publish.figures import draw, picture

    report(0.1)
    shown = settings.model_copy(update={"dpi": 110})
    return picture(draw(bench.updated(session), shown), shown, "png")


def figure_file(bench: Any, session: Session, settings, out: Path, report: Report) -> Path:
    """Write the figure, or the moving picture, and the caption beside it."""
    from fieldview.files.writing import said_if_unwritable, write_whole
    from fieldview.publish.figures import animate, caption, draw, save
    from fieldview.publish.figures.animation import ENDINGS

    bench = bench.updated(session)
    if out.suffix[1:].lower() in ENDINGS:
        animate(bench, settings, out, progress=_followed(report))
    else:
        report(0.1)
        save(draw(bench, settings), settings, out)
    beside = out.with_suffix(".txt")
    with said_if_unwritable(beside):
        write_whole(beside, caption(bench, settings).encode())
    return out


def _followed(report: Report):
    """A progress function of the headless code that tells the window."""

    def follow(things: Iterable, what: str, total: int) -> Iterator:
        for number, thing in enumerate(things):
            yield thing
            report((number + 1) / max(total, 1))

    return follow
