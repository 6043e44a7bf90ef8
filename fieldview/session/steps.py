"""The cleaning steps of the ledger, as they stand in the session file.

A step is one model here that calls one function in ``fieldview.compute``. Its keys, bounds, units and help
texts make the form in the window, the JSON Schema and the command line's help.
"""

from __future__ import annotations

from itertools import pairwise
from typing import Annotated, Literal

from pydantic import Field, model_validator

from fieldview.session.base import Entry, Finite, Point, quantity
from fieldview.session.regions import ClosedShape

Limits = tuple[Finite | None, Finite | None]


class Step(Entry):
    """One line of the ledger. ``on`` switches it without losing its settings."""

    on: bool = Field(True, description="Whether the line takes part")


class Calibrate(Step):
    """Pixels and pulses become metres and seconds."""

    step: Literal["calibrate"] = "calibrate"
    metres_per_pixel: float | Point = Field(description="Scale, one number or one each for x and y [m/px]")
    pulse_separation: float = Field(gt=0, description="Time between the two pulses [s]")
    origin: Point = Field((0.0, 0.0), description="The pixel that becomes (0, 0) [px]")

    @property
    def scale(self) -> Point:
        scale = self.metres_per_pixel
        return scale if isinstance(scale, tuple) else (scale, scale)

    @model_validator(mode="after")
    def _positive(self):
        if min(self.scale) <= 0:
            raise ValueError("metres_per_pixel must be positive")
        return self


class TurnAxes(Step):
    """New axes: turned, reflected, shifted. The measured lattice stays; components turn with the axes."""

    step: Literal["turn_axes"] = "turn_axes"
    angle_deg: float = quantity(
        "angle", 0.0, help="Turn of the axes, counter-clockwise [deg]; a fixed vector then reads turned back"
    )
    about: Point = quantity("point", (0.0, 0.0), help="Point about which axes turn and reflect")
    reflect: Literal["x", "y"] | None = Field(None, description="The axis whose direction is reversed")
    shift: Point = quantity("lengths", (0.0, 0.0), help="Added to every coordinate, last")


class MovingFrame(Step):
    """The velocities seen by a moving observer."""

    step: Literal["moving_frame"] = "moving_frame"
    velocity: Point = quantity("velocities", (0.0, 0.0), help="Velocity of the observer, subtracted")
    mean: Literal["frame", "run"] | None = Field(
        None, description="Subtract the mean of the frame or of the whole run instead"
    )
    rotation: float = quantity("rate", 0.0, help="Rotation rate of the observer, counter-clockwise [rad/s]")
    about: Point = quantity("point", (0.0, 0.0), help="Centre of that rotation")


class Mask(Step):
    """Nodes that hold no flow: a body, a wall, a reflection."""

    step: Literal["mask"] = "mask"
    region: ClosedShape | None = Field(None, description="A closed shape in the plane")
    keep: Literal["inside", "outside"] = Field("outside", description="Which side of it keeps its vectors")
    motion: tuple[tuple[Finite, Finite, Finite, Finite], ...] = Field(
        (),
        description="Keyframes [frame, dx, dy, angle_deg], interpolated; turned about the shape's centroid",
        json_schema_extra={"quantity": "motion"},
    )
    channel: str | None = Field(None, description="A channel that marks the nodes instead of a shape")
    at_least: float | None = Field(None, description="Mask where the channel is at least this")
    at_most: float | None = Field(None, description="Mask where the channel is at most this")

    @model_validator(mode="after")
    def _one_source(self):
        if (self.region is None) == (self.channel is None):
            raise ValueError("a mask takes either a region or a channel")
        if self.channel is not None and self.at_least is None and self.at_most is None:
            raise ValueError("a mask from a channel needs at_least or at_most")
        frames = [key[0] for key in self.motion]
        if any(b <= a for a, b in pairwise(frames)):
            raise ValueError("the keyframes of a mask's motion must be in increasing order of frame")
        return self


class RangeTest(Step):
    """Vectors outside stated limits are rejected."""

    step: Literal["range_test"] = "range_test"
    u: Limits | None = quantity("component limits", None, help="Lowest and highest u; null is no limit")
    v: Limits | None = quantity("component limits", None, help="Lowest and highest v")
    w: Limits | None = quantity("component limits", None, help="Lowest and highest w")
    speed: Limits | None = quantity("component limits", None, help="Lowest and highest speed")


class QualityTest(Step):
    """Vectors whose quality channel lies outside limits are rejected."""

    step: Literal["quality_test"] = "quality_test"
    channel: str = Field(description="Name of the channel")
    at_least: float | None = Field(None, description="Reject where the channel is below this")
    at_most: float | None = Field(None, description="Reject where the channel is above this")


class MedianTest(Step):
    """Normalised median test (Westerweel & Scarano 2005)."""

    step: Literal["median_test"] = "median_test"
    radius: int = quantity("nodes", 1, ge=1, le=10, help="Half-width of the neighbourhood [nodes]")
    threshold: float = quantity("ratio", 2.0, gt=0, help="Largest normalised residual that is kept")
    floor: float | None = quantity(
        "velocity", None, ge=0, help="Expected noise level added to the residuals' median; sigma if left out"
    )
    passes: int = Field(1, ge=1, le=10, description="Times the test is repeated without what it rejected")


class SpreadTest(Step):
    """Vectors far from the frame's median are rejected."""

    step: Literal["spread_test"] = "spread_test"
    limit: float = quantity("ratio", 6.0, gt=0, help="Largest distance, in multiples of 1.4826 MAD")


class TimeTest(Step):
    """Vectors far from their own median in time are rejected (Hampel identifier)."""

    step: Literal["time_test"] = "time_test"
    half_window: int = quantity("frames", 3, ge=1, help="Frames taken on either side")
    limit: float = quantity("ratio", 4.0, gt=0, help="Largest distance, in multiples of 1.4826 MAD")


Vector = tuple[Annotated[int, Field(ge=0)], Annotated[int, Field(ge=0)], Annotated[int, Field(ge=0)]]


class HandEdit(Step):
    """Single vectors rejected or kept by hand, on the source lattice."""

    step: Literal["hand_edit"] = "hand_edit"
    reject: tuple[Vector, ...] = Field((), description="[frame, iy, ix] of vectors to reject")
    keep: tuple[Vector, ...] = Field((), description="[frame, iy, ix] of rejected vectors to take back")


class Fill(Step):
    """Missing and rejected vectors are replaced from their surroundings; masked ones never."""

    step: Literal["fill"] = "fill"
    method: Literal["linear", "harmonic", "biharmonic", "local_median"] = Field(
        "linear", description="How a value is made from the surroundings"
    )
    max_gap: int | None = quantity(
        "nodes", None, ge=1, help="Widest gap that is filled; no limit if left out"
    )


class Smooth(Step):
    """Noise is averaged away; errors become correlated, which the uncertainties follow."""

    step: Literal["smooth"] = "smooth"
    method: Literal["gaussian", "savitzky_golay", "penalised"] = Field(
        "gaussian", description="How neighbours are weighted"
    )
    width: float | None = quantity(
        "nodes",
        None,
        gt=0,
        help="gaussian: standard deviation (1 if left out); savitzky_golay: odd window (5); penalised: "
        "half-power wavelength (chosen by generalised cross-validation if left out)",
    )


AnyStep = Annotated[
    Calibrate
    | TurnAxes
    | MovingFrame
    | Mask
    | RangeTest
    | QualityTest
    | MedianTest
    | SpreadTest
    | TimeTest
    | HandEdit
    | Fill
    | Smooth,
    Field(discriminator="step"),
]

STEP_MODELS: tuple[type[Step], ...] = (
    Calibrate,
    TurnAxes,
    MovingFrame,
    Mask,
    RangeTest,
    QualityTest,
    MedianTest,
    SpreadTest,
    TimeTest,
    HandEdit,
    Fill,
    Smooth,
)
