"""The output of ``loopflux measure``: every region on every frame as a table, CSV or JSON."""

from __future__ import annotations

import json
import tempfile
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import Executor
from dataclasses import dataclass
from pathlib import Path
from typing import IO

from fieldview.compute.errors import InputError
from fieldview.publish.remarks import Remarks
from fieldview.publish.sharing import Share, bench_of, in_order, portions
from fieldview.publish.tables import csv_lines, text_lines
from fieldview.session.frames import left_out
from fieldview.session.measure import chosen_frames, measure_frames, unanswered
from fieldview.session.replay import Workbench
from fieldview.session.store import load_session

Progress = Callable[[Iterable, str, int], Iterator]
"""(frames, what is done, their number) -> the frames, shown as they pass."""


@dataclass(frozen=True)
class Measurement:
    """A finished output: a text to be read from its start, and whether there was anything to remark."""

    text: IO[str]
    remarks: bool


def measurement(
    path: Path,
    frames: str | None,
    format: str,
    *,
    progress: Progress,
    say,
    executor: Executor | None = None,
    strict: bool = False,
) -> Measurement:
    """Measure a session file; ``say`` is told every changed source, skipped frame and unanswered region.

    A ``strict`` measurement ends at the first frame that cannot be read.

    The text is written to a scratch file as it comes, so that memory does not grow with the frames and
    nothing comes out where the session turns out to be bad.

    Raises InputError where the session, the run or the frames cannot be used.
    """
    session = load_session(path)
    if not session.regions:
        raise InputError(f"{path}: has no regions to measure; draw one in the window or add it under regions")
    bench = Workbench(session)
    chosen = chosen_frames(bench, frames)
    remarks = Remarks(say, bench)
    rows = measured_rows(bench, chosen, remarks, executor, progress=progress, strict=strict)
    text = tempfile.TemporaryFile("w+", encoding="utf-8", newline="")  # noqa: SIM115 - handed on
    try:
        for line in FORMATS[format](path.name, rows):
            text.write(line + "\n")
    except BaseException:
        text.close()
        raise
    text.seek(0)
    return Measurement(text, bool(remarks))


def measured_rows(
    bench: Workbench,
    frames: list,
    remark: Callable[[str], None],
    executor: Executor | None,
    *,
    progress: Progress,
    strict: bool = False,
) -> Iterator[dict]:
    """Rows of the frames as they come; ``remark`` is told what was skipped and what has no value.

    Raises InputError where no frame could be read, or with ``strict`` at the first that cannot.
    """
    rows = progress(_rows(bench, frames, remark, executor, strict), "measuring", len(frames))
    return _watched(rows, remark)


def _rows(bench: Workbench, frames: list, remark, executor: Executor | None, strict: bool) -> Iterator[dict]:
    """Rows of the frames in their order, whoever makes them."""
    share = Share.of(bench.session)
    jobs = [(share, part) for part in portions(frames)]
    done, last_error = 0, None
    for results in in_order(_measured, jobs, executor):
        for frame, row, error in results:
            if row is None and strict:
                raise InputError(f"frame {frame}: {error}")
            if row is None:
                remark(f"frame {frame} was skipped: {error}")
                last_error = error
                continue
            done += 1
            yield row
    if last_error is not None and not done:
        raise InputError(last_error)


def _measured(job) -> list[tuple]:
    """(frame, row, None), or (frame, None, why it was skipped), of the frames of one job."""
    share, frames = job
    skipped: dict = {}
    rows = measure_frames(
        bench_of(share),
        frames,
        on_skip=lambda frame, error: skipped.update({frame: str(error)}),
        raise_if_none=False,
    )
    found = {row["frame"]: row for row in rows}
    return [(frame, found.get(frame), skipped.get(frame)) for frame in frames]


def _watched(rows: Iterable[dict], remark: Callable[[str], None]) -> Iterator[dict]:
    for row in rows:
        for sentence in left_out(row["regions"][0]["warnings"]):
            remark(f"frame {row['frame']}: {sentence}")
        for region in row["regions"]:
            if region["name"] in unanswered({"regions": [region]}):
                why = region["warnings"][0] if region["warnings"] else "no reason is known"
                remark(f'frame {row["frame"]}: "{region["name"]}" has no value: {why}')
        yield row


def _json_lines(name: str, rows: Iterable[dict]) -> Iterator[str]:
    yield f'{{"session": {json.dumps(name, ensure_ascii=False)}, "frames": ['
    held = None
    for row in rows:
        if held is not None:
            yield held + ","
        held = json.dumps(row, ensure_ascii=False, allow_nan=False)
    yield from [held] if held is not None else []
    yield "]}"


FORMATS: dict[str, Callable[[str, Iterable[dict]], Iterator[str]]] = {
    "table": lambda name, rows: text_lines(rows),
    "csv": lambda name, rows: csv_lines(rows),
    "json": _json_lines,
}
