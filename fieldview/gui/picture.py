"""Everything the window shows, as one immutable value: a command makes a new one, the panels draw it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from dataclasses import field as attribute
from pathlib import Path
from types import MappingProxyType
from typing import Any

import numpy as np

from fieldview.compute.field import Field
from fieldview.gui.jobs import Task
from fieldview.publish.units_shown import UnitView, unit_view
from fieldview.session.models import Session
from fieldview.session.regions import Region
from fieldview.session.undo import History

NOTHING: Mapping = MappingProxyType({})


@dataclass(frozen=True)
class Shown:
    """What of the session is looked at, and how. No undo step, no number; kept under ``view`` on saving.

    Attributes
    ----------
    source : "frame", "mean" or "fluctuation" (the frame less the mean)
    as_of : int or None
        Number of ledger lines that are applied; None is all.
    levels : mapping of quantity name to (low, high)
        Colour-bar ranges, locked from frame to frame.
    speed : float or None
        Speed of the reference arrow, locked likewise. [velocity]
    coverage : float
        Factor k by which uncertainties are multiplied for showing.
    units : "session", "mm" or "reference"
        What numbers are shown in.
    trace : "circulation" or "flux"
        Which number of the chosen region is drawn over time.
    seeds : tuple of complex
        Points of the plane through which a streamline is drawn. [length]
    """

    frame: int = 0
    source: str = "frame"
    quantity: str = "vorticity"
    iso_lines: str | None = None
    arrow_colour: str | None = None
    arrow_stretch: float = 1.0
    rejected_arrows: bool = False
    selected: str | None = None
    line: int | None = None
    as_of: int | None = None
    tool: str = "move"
    levels: Mapping[str, tuple[float, float]] = attribute(default_factory=lambda: NOTHING)
    speed: float | None = None
    coverage: float = 1.0
    units: str = "session"
    drawer: str = "growth"
    trace: str = "circulation"
    seeds: tuple[complex, ...] = ()


@dataclass(frozen=True, eq=False)
class RunFacts:
    """What is known of the run without reading its frames."""

    frames: int
    times: tuple[float | None, ...]
    names: tuple[str, ...]
    units: str
    shape: tuple[int, int]
    spacing: tuple[float, float]
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, eq=False)
class MapOf:
    """A quantity of the shown field, ready to be drawn.

    Attributes
    ----------
    values, uncertainty : ndarray (ny, nx); uncertainty may be None
    kind : "signed", "unsigned" or "cyclic"
    """

    name: str
    of: Field
    title: str
    symbol: str
    unit: str
    kind: str
    values: np.ndarray
    uncertainty: np.ndarray | None
    reason: str | None = None
    fallback: int = 0


@dataclass(frozen=True, eq=False)
class Card:
    """A quantity at a glance: a small map, its range, its largest value over its own uncertainty."""

    name: str
    of: Field
    title: str
    symbol: str
    unit: str
    group: str
    kind: str
    thumbnail: np.ndarray
    low: float | None
    high: float | None
    times_u: float | None
    reason: str | None = None


@dataclass(frozen=True, eq=False)
class IsoLines:
    """Lines of equal value of a quantity: (level, pieces as complex arrays in the plane)."""

    name: str
    of: Field
    step: float
    lines: tuple[tuple[float, tuple[np.ndarray, ...]], ...]


@dataclass(frozen=True, eq=False)
class Streams:
    """Streamlines of a field through these seeds, as complex arrays in the plane."""

    of: Field
    seeds: tuple[complex, ...]
    lines: tuple[np.ndarray, ...]


@dataclass(frozen=True, eq=False)
class Curve:
    """Two quantities along one axis, for the drawer: of which page, field and region.

    ``x`` is arc length or scale; ``first`` and ``second`` tangential and normal component, or Γ and Φ;
    ``u_first`` and ``u_second`` their standard uncertainties, or None.
    """

    page: str
    of: Field
    region: Region
    x: np.ndarray
    first: np.ndarray
    second: np.ndarray
    u_first: np.ndarray | None = None
    u_second: np.ndarray | None = None


@dataclass(frozen=True, eq=False)
class Measured:
    """The numbers of one region: as the command line prints them, and where they came from."""

    region: Region
    row: Mapping[str, Any]
    numbers: Any
    line: str
    whole: bool = True


@dataclass(frozen=True, eq=False)
class Basis:
    """The session that numbers over the run were made from."""

    session: Session

    def holds(self, session: Session | None, region: Region | None) -> bool:
        """Whether they are still the numbers of this region in this session."""
        return (
            session is not None
            and region in self.session.regions
            and session.line == self.session.line
            and field_parts(session) == field_parts(self.session)
        )


@dataclass(frozen=True, eq=False)
class Traced:
    """The rows of every region on one frame of the run, by name."""

    basis: Basis
    rows: Mapping[str, Mapping[str, Any]]


def field_parts(session: Session) -> tuple:
    """What of a session its evaluated fields depend on."""
    return (session.run, session.units, session.ledger, session.error_model, session.derivative)


@dataclass(frozen=True)
class Notice:
    """A sentence for the banner; ``offers`` are (text, command id) of its buttons."""

    text: str
    grave: bool = True
    offers: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, eq=False)
class Picture:
    """The window at one moment."""

    history: History | None = None
    saved: Session | None = None
    path: Path | None = None
    shown: Shown = attribute(default_factory=Shown)
    run: RunFacts | None = None
    field: Field | None = None
    field_frame: int | None = None
    tallies: tuple = ()
    prepared: Any = None
    map: MapOf | None = None
    iso: IsoLines | None = None
    tint: MapOf | None = None
    cards: Mapping[str, Card] = attribute(default_factory=lambda: NOTHING)
    measured: Mapping[str, Measured] = attribute(default_factory=lambda: NOTHING)
    shares: Mapping[int, float] = attribute(default_factory=lambda: NOTHING)
    traces: Mapping[int, Traced] = attribute(default_factory=lambda: NOTHING)
    curve: Curve | None = None
    streams: Streams | None = None
    draft: Region | None = None
    draft_of: str | None = None
    draft_measured: Measured | None = None
    cursor: complex | None = None
    notice: Notice | None = None
    tasks: tuple[Task, ...] = ()

    @property
    def session(self) -> Session | None:
        return self.history.session if self.history else None

    @property
    def unsaved(self) -> bool:
        return self.session is not None and self.session != self.saved

    @property
    def regions(self) -> tuple[Region, ...]:
        """The regions as they are to be drawn: with the one being dragged in its new place."""
        if self.session is None:
            return ()
        return tuple(
            self.draft if r.name == self.draft_of and self.draft else r for r in self.session.regions
        )

    @property
    def selected(self) -> Region | None:
        return next((r for r in self.regions if r.name == self.shown.selected), None)

    def measured_of(self, region: Region) -> Measured | None:
        """The numbers of a region as it is drawn now, where they are known."""
        if region is self.draft:
            return self.draft_measured
        measured = self.measured.get(region.name)
        return measured if measured is not None and measured.region == region else None

    @property
    def stale(self) -> bool:
        """Whether the numbers shown are of an earlier state: the field of this one is late."""
        return any(task.slow and task.kind in ("open", "field") for task in self.tasks)

    @property
    def tint_now(self) -> MapOf | None:
        """The arrows' colour quantity, where it is of the field that is shown."""
        right = self.tint is not None and self.tint.of is self.field
        return self.tint if right and self.tint.name == self.shown.arrow_colour else None

    @property
    def unit_view(self) -> UnitView:
        return unit_view(self.session, self.shown.units)

    @property
    def curve_now(self) -> Curve | None:
        """The drawer's curve, where it is of this page, field and region."""
        curve, region = self.curve, self.selected
        right = curve is not None and curve.page == self.shown.drawer and curve.of is self.field
        return curve if right and curve.region == region else None

    @property
    def iso_now(self) -> IsoLines | None:
        right = self.iso is not None and self.iso.of is self.field
        return self.iso if right and self.iso.name == self.shown.iso_lines else None

    @property
    def streams_now(self) -> Streams | None:
        right = self.streams is not None and self.streams.of is self.field
        return self.streams if right and self.streams.seeds == self.shown.seeds else None

    def with_(self, **changes) -> Picture:
        return replace(self, **changes)

    def showing(self, **changes) -> Picture:
        return replace(self, shown=replace(self.shown, **changes))
