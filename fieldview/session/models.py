"""The session: one immutable document of everything the user decided."""

from __future__ import annotations

from pathlib import Path
from typing import Any, Literal

from pydantic import Field, PrivateAttr, field_validator, model_validator

from fieldview.files.reading import Reading
from fieldview.session.base import Entry, Point, quantity
from fieldview.session.figures import FigureSettings
from fieldview.session.regions import Region
from fieldview.session.steps import AnyStep, Calibrate, TurnAxes

FORMAT = "loopflux-session"
VERSION = 1


class RunSource(Entry):
    """Which files make the run and how they are read."""

    files: tuple[str, ...] = Field(
        min_length=1, description="Paths or patterns relative to the session file, in natural order"
    )
    reading: Reading = Field(default_factory=Reading, description="What the files do not say of themselves")
    store: str | None = Field(
        None, description="Run store that frames may be read from, relative to the session file"
    )
    digests: dict[str, str] = Field(
        default_factory=dict, description="sha256 of each source when the session was saved"
    )


class SystematicParts(Entry):
    """Standard uncertainties of errors common to every vector; one left out counts as not stated."""

    scale: float | None = quantity("ratio", None, ge=0, help="Relative error of the length scale")
    pulse_separation: float | None = quantity("ratio", None, ge=0, help="Relative, of the pulse separation")
    gain: float | None = quantity("ratio", None, ge=0, help="Relative velocity error common to all points")
    axis_tilt: float | None = quantity("ratio", None, ge=0, help="Angle of the axes to the true ones [rad]")
    zero_offset: float | None = quantity("velocity", None, ge=0, help="Velocity error common to all points")


class Uncertainties(Entry):
    """The error model of the run."""

    sigma: float | dict[Literal["u", "v", "w"], float] | Literal["from file", "estimate"] | None = Field(
        None,
        description="Standard uncertainty of a vector: one number, one per component, taken from the file, "
        "or estimated from the run",
        json_schema_extra={"quantity": "velocity"},
    )
    correlation_nodes: float | Point | None = quantity(
        "nodes", None, help="Window size over spacing, one number or one each for x and y"
    )
    systematic: SystematicParts = Field(default_factory=SystematicParts)
    window: float | Point | None = quantity(
        "lengths", None, help="Size of the measuring window; 0 is a point probe"
    )

    @field_validator("sigma", mode="before")
    @classmethod
    def _known_word(cls, sigma):
        if isinstance(sigma, str) and sigma not in ("from file", "estimate"):
            raise ValueError('give a number, one per component, "from file" or "estimate"')
        return sigma

    @model_validator(mode="after")
    def _in_bounds(self):
        numbers = self.sigma.values() if isinstance(self.sigma, dict) else [self.sigma]
        if any(isinstance(s, float) and s < 0 for s in numbers):
            raise ValueError("sigma must not be negative")
        spread = self.correlation_nodes
        if spread is not None and min(spread if isinstance(spread, tuple) else (spread,)) <= 0:
            raise ValueError("correlation_nodes must be positive; 1 is independent errors")
        window = self.window
        if window is not None and min(window if isinstance(window, tuple) else (window,)) < 0:
            raise ValueError("window must not be negative; 0 is a point probe")
        return self


class Reference(Entry):
    """Reference length and velocity for nondimensional axes and numbers."""

    length: float | None = quantity("length", None, gt=0, help="Reference length")
    velocity: float | None = quantity("velocity", None, gt=0, help="Reference velocity")
    length_name: str | None = Field(None, min_length=1, description="What the length is, such as chord")
    u_length: float | None = quantity("length", None, ge=0, help="Standard uncertainty of the length")
    u_velocity: float | None = quantity("velocity", None, ge=0, help="Standard uncertainty of the velocity")


class PhaseSource(Entry):
    """What the phase of a frame is, for averages by phase: a channel, or a frequency and the frame's time."""

    channel: str | None = Field(None, description="Channel of the run that holds the phase")
    unit: Literal["deg", "rad", "1"] = Field("deg", description="Unit of the channel; 1 is cycles")
    frequency: float | None = quantity("frequency", None, gt=0, help="Of the cycle, phase 0 at time 0 [1/s]")
    u_frequency: float | None = quantity("frequency", None, ge=0, help="Its standard uncertainty [1/s]")
    width: float | None = quantity("ratio", None, gt=0, le=1, help="Of a bin in cycles; touching if left out")

    @model_validator(mode="after")
    def _one_of_both(self):
        if (self.channel is None) == (self.frequency is None):
            raise ValueError("give either channel or frequency, one of them")
        return self


class Session(Entry):
    """Everything the user decided, as one value. An edit makes a new one: ``session.model_copy``."""

    format: Literal["loopflux-session"] = FORMAT
    version: Literal[1] = VERSION
    title: str = Field("", description="What was measured")
    units: Literal["m, s", "px, pulse"] | None = Field(
        None, description="Units of every number here; what the files give (after calibrate) if left out"
    )
    run: RunSource
    error_model: Uncertainties = Field(default_factory=Uncertainties)
    derivative: Literal["central", "richardson", "least_squares", "circulation"] = Field(
        "central", description="Scheme of all derivatives"
    )
    line: Literal["bilinear", "cubic"] = Field(
        "bilinear", description="The field between nodes, along contours"
    )
    ledger: tuple[AnyStep, ...] = Field((), description="Cleaning steps, in order")
    regions: tuple[Region, ...] = Field((), description="Contours and lines")
    reference: Reference = Field(default_factory=Reference)
    phase: PhaseSource | None = Field(None, description="What the phase of a frame is, for phase averages")
    figures: tuple[FigureSettings, ...] = Field((), description="Figures that are made of this session")
    view: dict[str, Any] = Field(default_factory=dict, description="How the window shows it; no number")

    _folder: Path | None = PrivateAttr(None)

    def __eq__(self, other):
        # the folder stands beside the value, not in it
        return type(self) is type(other) and self.__dict__ == other.__dict__

    __hash__ = None

    @property
    def folder(self) -> Path:
        """Folder that the run's paths are relative to."""
        return self._folder if self._folder is not None else Path()

    def in_folder(self, folder: Path | str) -> Session:
        """The same session, its paths taken from this folder."""
        moved = self.model_copy()
        moved._folder = Path(folder)
        return moved

    @model_validator(mode="after")
    def _consistent(self):
        names = [region.name for region in self.regions]
        twice = next((name for name in names if names.count(name) > 1), None)
        if twice is not None:
            raise ValueError(f'two regions are named "{twice}"; names must be unique')
        names = [figure.name for figure in self.figures]
        twice = next((name for name in names if names.count(name) > 1), None)
        if twice is not None:
            raise ValueError(f'two figures are named "{twice}"; names must be unique')
        for model in (Calibrate, TurnAxes):
            places = [i for i, step in enumerate(self.ledger) if isinstance(step, model)]
            key = model.model_fields["step"].default
            if len(places) > 1:
                raise ValueError(f"{key} may stand in the ledger only once")
            if places and any(
                not isinstance(step, Calibrate | TurnAxes) for step in self.ledger[: places[0]]
            ):
                raise ValueError(f"{key} must come before the other steps of the ledger")
        return self


__all__ = [
    "FORMAT",
    "VERSION",
    "PhaseSource",
    "Reference",
    "RunSource",
    "Session",
    "SystematicParts",
    "Uncertainties",
]
