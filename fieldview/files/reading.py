"""What a file does not say of itself: the answers under ``run.reading`` of the session."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

Column = str | Annotated[int, Field(ge=0)]

ROLES = (
    "x", "y", "u", "v", "w", "speed", "direction", "time", "frame",
    "sigma_u", "sigma_v", "sigma_w", "status",
)  # fmt: skip
"""What a column can be; every further numeric column becomes a channel under its own name."""


class Entry(BaseModel):
    """A part of the session: immutable, and an unknown key is an error."""

    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False)


class Reading(Entry):
    """How the run's files are read. Only what the files do not say need be given."""

    columns: dict[str, Column] = Field(
        default_factory=dict,
        description="Role of a column, by its name or its number counted from 0: " + ", ".join(ROLES),
    )
    ignore: tuple[Column, ...] = Field((), description="Columns that are not read at all")
    length_unit: str | None = Field(None, description="Unit of x and y, such as mm or px")
    velocity_unit: str | None = Field(
        None, description="Unit of the components; px is a displacement per pulse, mm a displacement too"
    )
    pulse_separation: float | None = Field(
        None, gt=0, description="Time between the pulses, for components that are displacements [s]"
    )
    frame_interval: float | None = Field(None, gt=0, description="Time from frame to frame [s]")
    time_unit: str | None = Field(None, description="Unit of the time column")
    y_axis: Literal["up", "down"] | None = Field(None, description="Whether y grows upward or downward")
    v_positive: Literal["up", "down"] | None = Field(None, description="Which way a positive v points")
    direction_zero: Literal["north", "x"] | None = Field(
        None, description="A direction's zero: north (degrees clockwise) or +x (degrees counter-clockwise)"
    )
    direction_sense: Literal["towards", "from"] | None = Field(
        None, description="Whether a direction says where the flow goes or where it comes from"
    )
    vector_position: Literal["midpoint", "first_image"] = Field(
        "midpoint", description="Where the vectors stand: first_image is moved by half the displacement"
    )
    missing: tuple[float, ...] = Field((), description="Numbers that mean 'no value'")
    select: dict[str, int | float | str] = Field(
        default_factory=dict, description="Which entry of a further dimension or variable of a container"
    )
