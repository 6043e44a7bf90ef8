"""What runs in the background: pure functions of frozen requests. They ask the session and computing layers
for every number and only put the answers into the shape that the panels draw."""

from __future__ import annotations

import os
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.gui.jobs import Progress
from fieldview.gui.picture import Basis, Card, Curve, IsoLines, MapOf, Measured, RunFacts, Streams, Traced
from fieldview.session.models import RunSource, Session

THUMBNAIL = (96, 48)
Report = Callable[[float], None]
GROWTH_FACTORS = np.linspace(0.1, 2.0, 39)
DEAL_SECONDS = 0.05
"""Cards that are ready within this time are drawn together."""

CACHE_BYTES = 400_000_000
"""How much of the replay the window keeps: some dozens of frames of a million nodes."""


@dataclass(frozen=True, eq=False)
class Opened:
    """A session whose run was found, and the workbench that reads and replays it."""

    session: Session
    bench: Any
    facts: RunFacts


@dataclass(frozen=True, eq=False)
class Evaluated:
    """A frame after the ledger with what the canvas needs to draw it at once."""

    bench: Any
    field: Field
    frame: int
    tallies: tuple
    map: MapOf | None
    prepared: Any
    measured: dict[str, Measured]
    facts: RunFacts | None = None
    whole_run: Any = None


def session_of_files(paths) -> Session:
    """A new session whose run is these files, their paths relative to their common folder."""
    whole = [Path(os.path.abspath(path)) for path in paths]
    missing = next((p for p in whole if not p.exists()), None)
    if missing is not None:
        raise InputError(f"{missing}: there is no such file or folder; check the path")
    folder = Path(os.path.commonpath([p.parent for p in whole]))
    names = tuple(p.relative_to(folder).as_posix() for p in whole)
    return Session(run=RunSource(files=names)).in_folder(folder)


def open_session(session: Session) -> Opened:
    """Find the run and learn its facts, without reading more of it than the first frame."""
    from fieldview.session.replay import Workbench

    bench = Workbench(session, cache_bytes=CACHE_BYTES)
    run = bench.run
    if session.units is None:
        units = "m, s" if any(s.step == "calibrate" and s.on for s in session.ledger) else str(run.units)
        session = session.model_copy(update={"units": units})
    return Opened(session, bench, _facts(run))


def evaluate(
    session: Session,
    bench: Any,
    frame: int,
    source: str,
    as_of: int | None,
    quantity: str,
    whole_run: Any,
    report: Report,
) -> Evaluated:
    """One frame after the ledger, the run's mean, or the frame less the mean; mapped, its regions measured
    quickly. ``whole_run`` is the run's mean as an earlier answer found it, or None."""
    from fieldview.compute.region import prepare
    from fieldview.session.statistics import fluctuation

    run_before, bench = bench.run, bench.updated(session)
    facts = _facts(bench.run) if bench.run is not run_before else None
    frame = min(frame, len(bench.run) - 1)
    if source != "frame" and whole_run is None:
        whole_run = mean_over_run(bench, as_of, report)
    if source == "mean":
        field, tallies = whole_run, ()
    else:
        field, tallies = bench.field(frame, upto=as_of), tuple(bench.tallies(frame))
    if source == "fluctuation":
        field = fluctuation(field, whole_run, len(bench.run))
    prepared = prepare(field)
    measured = {m.region.name: m for m in measure_quickly(session, field, prepared, session.regions)}
    shown = quick_map(field, quantity)
    return Evaluated(bench, field, frame, tallies, shown, prepared, measured, facts, whole_run)


def mean_over_run(bench: Any, as_of: int | None, report: Report) -> Field:
    """The run's mean, frame by frame, so that it can be followed and cancelled."""
    from fieldview.session.mean import mean_of

    def frames() -> Iterator[Field]:
        count = len(bench.run)
        for frame in range(count):
            report(frame / count)
            yield bench.field(frame, upto=as_of)

    return mean_of(frames())


def warm_up() -> None:
    """Import what the first drawn region would otherwise wait for on the window's own thread."""
    from importlib import import_module

    for name in ("scipy.sparse", "scipy.ndimage", "shapely", "contourpy", "fieldview.compute.region"):
        import_module(name)


def measure_quickly(session: Session, field: Field, prepared: Any, wanted) -> list[Measured]:
    """The numbers that follow a drag: the same functions as the full ones, without the costly parts."""
    from fieldview.compute.region import quick_numbers
    from fieldview.session.measure import region_row

    measured = []
    for region in wanted:
        numbers = quick_numbers(field, region.outline(), prepared, line=session.line)
        measured.append(Measured(region, region_row(region, numbers), numbers, session.line, whole=False))
    return measured


def measure_fully(session: Session, field: Field, wanted) -> Iterator[Measured]:
    """Every number of these regions, one after the other, as the command line prints them."""
    from fieldview.session.measure import measure_field, region_row

    for region in wanted:
        alone = session.model_copy(update={"regions": (region,)})
        numbers = measure_field(alone, field)[region.name]
        yield Measured(region, region_row(region, numbers), numbers, session.line)


def quick_map(field: Field, name: str) -> MapOf | None:
    """A quantity of the field without its uncertainty; None where the field does not have it."""
    from fieldview.compute.quantities import QUANTITIES, quantity

    known = QUANTITIES.get(name)
    if known is None:
        return None
    try:
        values = quantity(field, name)
    except InputError:
        return None
    return MapOf(
        name,
        field,
        known.title,
        known.symbol,
        known.unit(field.units),
        _kind(known),
        values,
        None,
        "not yet known",
    )


def full_map(field: Field, name: str) -> MapOf | None:
    """A quantity with its uncertainty, or the reason for none."""
    from fieldview.compute.quantities import QUANTITIES, quantity_map

    known = QUANTITIES[name]
    made = quantity_map(field, name)
    return MapOf(
        name,
        field,
        known.title,
        known.symbol,
        made.unit,
        _kind(known),
        made.values,
        made.uncertainty,
        made.reason,
        made.fallback_count,
    )


def deal_cards(field: Field, names) -> Iterator[MapOf | tuple[Card, ...] | Progress]:
    """A card for every quantity the field has, a few at a time; the first name's full map before them."""
    ready: list[Card] = []
    since = time.monotonic()
    for number, name in enumerate(names):
        try:
            made = full_map(field, name)
        except InputError:
            continue
        if number == 0:
            yield made
        ready.append(_card(made))
        if time.monotonic() - since >= DEAL_SECONDS:
            yield tuple(ready)
            yield Progress((number + 1) / len(names))
            ready, since = [], time.monotonic()
    yield tuple(ready)


def available(field: Field) -> tuple[str, ...]:
    """Names of the quantities that this field has the components for, in the order of the panel."""
    from fieldview.compute.quantities import QUANTITIES

    parts = field.components
    return tuple(name for name, known in QUANTITIES.items() if all(need in parts for need in known.needs))


def iso_lines(field: Field, name: str, step: float) -> IsoLines | None:
    """Lines of equal value of a quantity at every multiple of ``step``; zero left out where signed."""
    from contourpy import contour_generator

    grid, shown = field.grid, quick_map(field, name)
    if shown is None or not grid.is_plane:
        return None
    finite = shown.values[np.isfinite(shown.values)]
    if finite.size == 0:
        return None
    first, last = int(np.ceil(finite.min() / step)), int(np.floor(finite.max() / step))
    lines = contour_generator(grid.x, grid.y, np.ma.masked_invalid(shown.values))
    found = []
    for k in range(first, last + 1):
        if k == 0 and shown.kind == "signed":
            continue
        pieces = tuple(
            grid.placement.to_plane(piece[:, 0] + 1j * piece[:, 1]) for piece in lines.lines(k * step)
        )
        found.append((k * step, pieces))
    return IsoLines(name, field, step, tuple(found))


def streams(field: Field, seeds: tuple[complex, ...]) -> Streams:
    """The streamlines through the seeds."""
    from fieldview.compute.streamlines import streamlines

    return Streams(field, seeds, tuple(streamlines(field, seeds)))


def measured_shares(bench: Any, frames) -> Iterator[tuple[int, float] | Progress]:
    """Share of nodes measured, frame by frame, as the ledger leaves them."""
    for number, frame in enumerate(frames):
        yield frame, measured_share(bench.field(frame))
        yield Progress((number + 1) / len(frames))


def measured_share(field: Field) -> float:
    """Share of the unmasked nodes that hold a measured vector."""
    unmasked = field.status.size - field.count(Status.MASKED)
    return field.count(Status.MEASURED) / unmasked if unmasked else 0.0


def follow_regions(bench: Any, session: Session, frames) -> Iterator[tuple[int, float, Traced] | Progress]:
    """The rows of every region, frame by frame, with the share measured."""
    from fieldview.session.measure import measure_field, region_row

    basis = Basis(session)
    for number, frame in enumerate(frames):
        field = bench.field(frame)
        numbers = measure_field(session, field)
        rows = {region.name: region_row(region, numbers[region.name]) for region in session.regions}
        yield frame, measured_share(field), Traced(basis, rows)
        yield Progress((number + 1) / len(frames))


def save(session: Session, bench: Any, path: Path, view: dict) -> Path:
    """Write the session with the digests of its sources and the view."""
    from fieldview.session.store import save_session

    run = session.run.model_copy(update={"digests": bench.run.digests()}) if bench else session.run
    save_session(session.model_copy(update={"run": run, "view": view}).in_folder(session.folder), path)
    return path


def changed_sources(bench: Any) -> tuple[str, ...]:
    """A sentence for every source file that is not what it was when the session was saved."""
    return tuple(bench.changed_sources())


def export_field(field: Field, path: Path, names) -> Path:
    """Write the cleaned field with these quantities; the ending of the name chooses the format."""
    from fieldview.files.writers import writer
    from fieldview.publish.maps import check_ending, quantity_values

    check_ending(path)
    writer(path.suffix[1:].lower())(path, field, quantities=quantity_values(field, names))
    return path


def _facts(run: Any) -> RunFacts:
    count = len(run)
    grid = run.grid
    return RunFacts(
        frames=count,
        times=tuple(run.times),
        names=tuple(run.frame_name(i) for i in range(count)) if count <= 2000 else (),
        units=str(run.units),
        shape=grid.shape,
        spacing=grid.spacing,
        notes=tuple(run.notes),
    )


def _kind(known: Any) -> str:
    if known.angle:
        return "cyclic"
    return "signed" if known.signed else "unsigned"


def _card(made: MapOf) -> Card:
    from fieldview.compute.quantities import QUANTITIES

    finite = np.isfinite(made.values)
    low = float(made.values[finite].min()) if finite.any() else None
    high = float(made.values[finite].max()) if finite.any() else None
    return Card(
        made.name,
        made.of,
        made.title,
        made.symbol,
        made.unit,
        QUANTITIES[made.name].group,
        made.kind,
        _thumbnail(made.values),
        low,
        high,
        _times_own_uncertainty(made),
        made.reason,
    )


def _times_own_uncertainty(made: MapOf) -> float | None:
    if made.uncertainty is None or made.kind == "cyclic":
        return None
    size = np.abs(made.values)
    known = np.isfinite(size) & (made.uncertainty > 0)
    if not known.any():
        return None
    at = np.argmax(np.where(known, size, -1.0))
    return float(size.flat[at] / made.uncertainty.flat[at])


def _thumbnail(values: np.ndarray) -> np.ndarray:
    """Every n-th node, so that the little map has about the size of a card's."""
    rows = max(1, -(-values.shape[0] // THUMBNAIL[1]))
    columns = max(1, -(-values.shape[1] // THUMBNAIL[0]))
    return np.array(values[::rows, ::columns])


def curve_of(session: Session, field: Field, page: str, region) -> Curve | None:
    """The drawer's curve for a region: along its contour or line, or as it grows about its centroid."""
    from fieldview.compute.growth import around, growth_curve

    shape = region.outline()
    if shape.problem() is not None:
        return None
    if page == "growth":
        grown = growth_curve(field, shape, GROWTH_FACTORS, line=session.line)
        return Curve(
            page,
            field,
            region,
            GROWTH_FACTORS,
            _values(grown.circulation),
            _values(grown.flux),
            _spreads(grown.circulation),
            _spreads(grown.flux),
        )
    along = around(field, shape)
    return Curve(page, field, region, along.arc_length, along.tangential, along.normal)


def _values(numbers) -> np.ndarray:
    return np.array([np.nan if n.value is None else n.value for n in numbers])


def _spreads(numbers) -> np.ndarray | None:
    found = np.array([np.nan if n.combined is None else n.combined for n in numbers])
    return found if np.isfinite(found).any() else None
