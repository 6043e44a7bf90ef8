"""The outputs of ``loopflux check`` and ``loopflux stats``: the run check and the statistics of a run."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Iterator
from concurrent.futures import Executor
from pathlib import Path

from fieldview.compute.errors import InputError
from fieldview.compute.lag_window import LAGS
from fieldview.publish import wording
from fieldview.publish.maps import Values, check_ending, write_maps
from fieldview.publish.measuring import Progress
from fieldview.publish.outputs import as_text
from fieldview.publish.remarks import Remarks
from fieldview.publish.sharing import Share, bench_of, in_order, portions
from fieldview.session.check import RunCheck, Seen, run_check, seen
from fieldview.session.replay import Workbench
from fieldview.session.statistics import RunStatistics, frame_numbers, stretch_statistics, stretches
from fieldview.session.store import load_session


def check_report(
    path: Path,
    frames: str | None,
    format: str,
    *,
    progress: Progress,
    say,
    executor: Executor | None = None,
) -> tuple[str, bool]:
    """The run check of a session as text, and whether there was anything to remark about the sources."""
    bench = Workbench(load_session(path))
    remarks = Remarks(say, bench)
    numbers = frame_numbers(bench, frames)
    found = checked(bench, numbers, progress=progress, remark=remarks, executor=executor)
    rows, findings = found.frame_rows(), found.rows()
    told = {"session": path.name, "findings": findings, "frames": rows}
    return as_text(format, told, rows, _findings(findings)), bool(remarks)


def checked(
    bench: Workbench, numbers: list[int], *, progress: Progress, remark, executor: Executor | None = None
) -> RunCheck:
    """The run check over these frames, whoever replays them; ``remark`` is told what was skipped."""
    ticks = iter(progress(numbers, "checking", len(numbers)))
    next(ticks, None)
    share = Share.of(bench.session)

    def see(numbers: list[int]) -> Iterator[Seen]:
        for part in in_order(_seen, [(share, part) for part in portions(numbers)], executor):
            yield from part

    return run_check(
        bench,
        numbers,
        see=see,
        on_skip=lambda frame, error: remark(f"frame {frame} was skipped: {error}"),
        on_frame=lambda _: next(ticks, None),
    )


def _seen(job) -> list[Seen]:
    share, numbers = job
    return [seen(bench_of(share), number) for number in numbers]


def _findings(rows: list[dict]) -> Iterator[str]:
    for row in rows:
        yield f"{row['item']} ({row['concern']})"
        yield from textwrap.wrap(row["verdict"], 98, initial_indent="  ", subsequent_indent="  ")
        yield ""


def statistics_report(
    path: Path,
    frames: str | None,
    format: str,
    *,
    filled: bool,
    subtract_noise: bool,
    points: Iterable[tuple[float, float]],
    maps: Path | None,
    progress: Progress,
    say,
    executor: Executor | None = None,
) -> tuple[str, bool]:
    """The statistics of a session's run as text, and whether there was anything to remark.

    With ``maps`` the mean field is written to that file too, every statistic and its uncertainty beside it.
    """
    check_ending(maps)
    bench = Workbench(load_session(path))
    remarks = Remarks(say, bench)
    run = statistics_over(
        bench,
        frame_numbers(bench, frames),
        filled=filled,
        progress=progress,
        remark=remarks,
        executor=executor,
    )
    rows = run.rows(subtract_noise=subtract_noise, points=points)
    if maps is not None:
        write_maps(maps, run.mean, _map_values(run, subtract_noise), session=path)
    told = {"session": path.name, "frames": run.frames, "statistics": rows, "remarks": run.remarks()}
    return as_text(format, told, rows, _statistics(rows, run)), bool(remarks)


def statistics_over(
    bench: Workbench,
    numbers: list[int],
    *,
    filled: bool = False,
    progress: Progress,
    remark,
    executor: Executor | None = None,
) -> RunStatistics:
    """The statistics over these frames, whoever replays them; ``remark`` is told what was skipped.

    Raises InputError where no frame could be used.
    """
    run, last = RunStatistics(filled=filled), "the run has no frames"
    jobs = [(Share.of(bench.session), tuple(part), filled) for part in stretches(numbers)]
    for part, skipped in progress(in_order(_stretch, jobs, executor), "statistics", len(jobs)):
        run.merge(part)
        for last in skipped:
            remark(last)
    if not run.frames:
        raise InputError(last)
    return run


def _stretch(job) -> tuple[RunStatistics, list[str]]:
    share, numbers, filled = job
    skipped: list[str] = []
    part = stretch_statistics(
        bench_of(share),
        numbers,
        filled=filled,
        lags=LAGS,
        on_skip=lambda frame, error: skipped.append(f"frame {frame} was skipped: {error}"),
    )
    return part, skipped


def _statistics(rows: list[dict], run: RunStatistics) -> Iterator[str]:
    yield f"{run.frames} frames; medians over the nodes, with the median of their standard uncertainties"
    yield ""
    for row in rows:
        shown = _number(row["median"], row["median_uncertainty"], row["unit"])
        span = f"{wording.short(row['lowest'])} … {wording.short(row['highest'])}"
        yield f"  {row['name']:<22} {shown:<34} {span}"
        for point in row.get("points", ()):
            at = "at ({}, {})".format(*(wording.short(place) for place in point["place"]))
            yield f"  {at:>22} {_number(point['value'], point['uncertainty'], row['unit'])}"
    yield ""
    yield from (f"  ! {sentence}" for sentence in run.remarks())


def _number(value: float | None, spread: float | None, unit: str) -> str:
    """A value with its uncertainty, where that has a meaning; a count is a whole number."""
    if spread is not None:
        return wording.plus_minus(value, spread, unit)
    if value is not None and unit == "1" and float(value).is_integer():
        return f"{value:.0f}"
    return f"{wording.short(value, digits=4)} {wording.unit_text(unit)}".rstrip()


def _map_values(run: RunStatistics, subtract_noise: bool) -> Values:
    units, values = run.mean.units, {}
    for name, entry in run.maps(subtract_noise=subtract_noise).items():
        unit = entry.unit(units)
        values[name] = (entry.values, unit)
        if entry.uncertainty is not None:
            values[f"{name}_uncertainty"] = (entry.uncertainty, unit)
    return values
