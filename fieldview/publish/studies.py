"""Studies that repeat a measurement: choices of the analyst, comparison of two, repeats of the same."""

from __future__ import annotations

from collections.abc import Iterator
from concurrent.futures import Executor

from fieldview.publish.measuring import Progress
from fieldview.publish.sharing import Share, bench_of, in_order
from fieldview.session.choices import Cleaning, Study, cleanings, measured_choices, study
from fieldview.session.measure import region_named
from fieldview.session.replay import Frame, Workbench


def choices_study(
    bench: Workbench,
    region: str,
    frame: Frame,
    *,
    progress: Progress = lambda frames, what, total: iter(frames),
    executor: Executor | None = None,
) -> Study:
    """The study of one region on one frame; every way of cleaning is a piece of work of its own."""
    session = bench.session
    region_named(session, region)

    def fields(ways: list[Cleaning]) -> Iterator[list[tuple]]:
        share = Share.of(session)
        jobs = [(share, number, region, frame) for number in range(len(ways))]
        yield from progress(in_order(_measured, jobs, executor), f"choices of {region}", len(jobs))

    return study(session, region, frame, fields, bench.field(frame))


def _measured(job) -> list[tuple]:
    share, number, region, frame = job
    bench = bench_of(share)
    way = cleanings(bench.session)[number]
    field = bench.updated(way.session).field(frame)
    return list(measured_choices(way.session, region_named(way.session, region), field, way.chosen))
