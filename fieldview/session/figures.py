"""Figures as they stand in the session file, so that a figure repeats to the byte."""

from __future__ import annotations

from typing import Literal

from pydantic import Field, field_validator, model_validator

from fieldview.session.base import Entry, Finite, Point, quantity

WIDTHS = {"one": 85.0, "two": 175.0}
"""Widths of one and of two columns of a journal's page [mm] (common practice, no source)."""


class FigureSettings(Entry):
    """What one figure shows and how large it is."""

    name: str = Field("figure", min_length=1, description="Unique name of the figure")
    kind: Literal["map", "growth", "around", "profile", "time", "spectrum", "convergence"] = Field(
        "map", description="A map of the field, or a curve of a region or a probe"
    )
    quantities: tuple[str, ...] = Field(("vorticity",), min_length=1, description="One panel for each")
    frames: str = Field("0", description="Frames shown, one panel for each: 0, 0,6,12, mean or phase:4")
    columns: int | None = Field(None, ge=1, description="Panels side by side; as fits if left out")
    region: str | None = Field(None, description="Region of a curve; the first one if left out")
    number: Literal["circulation", "flux"] = Field(
        "circulation", description="Number of the regions; of a line ∫u·dl or the cross flow"
    )
    probe: Point | None = quantity("point", None, help="Place of a probe, for a curve over time")
    width_mm: Finite = Field(85.0, ge=30, le=1000, description="Width of the whole figure [mm]")
    height_mm: Finite | None = Field(None, ge=20, le=1500, description="Height; as fits if left out [mm]")
    font_pt: Finite = Field(8.0, ge=4, le=40, description="Size of the text [pt]")
    dpi: int = Field(300, ge=50, le=1200, description="Dots per inch of pictures")
    low: Finite | None = Field(None, description="Lower end of the colours, in the quantity's unit")
    high: Finite | None = Field(None, description="Upper end of the colours")
    arrows: bool = Field(True, description="Arrows of the velocity")
    arrow_spacing_mm: Finite = Field(2.4, gt=0.2, le=50, description="Least distance of arrows on paper [mm]")
    arrow_length: Finite = Field(1.0, gt=0, le=20, description="Factor on the arrows' own length")
    iso_lines: str | None = Field(None, description="Quantity drawn as iso-lines over the map")
    regions: bool = Field(True, description="Outlines of the regions")
    numbers: bool = Field(True, description="Numbers beside the regions")
    marks: bool = Field(True, description="Marks of filled, rejected, missing and masked nodes")
    scale_bar: bool = Field(False, description="A bar of a round length")
    length_unit: Literal["m", "mm"] | None = Field(
        None, description="Of axes and numbers in metres; millimetres below 1 m if left out"
    )
    title: str = Field("", description="Text above; none if empty")

    @field_validator("quantities", mode="before")
    @classmethod
    def _several(cls, value):
        return (value,) if isinstance(value, str) else value

    @model_validator(mode="after")
    def _in_order(self):
        if self.low is not None and self.high is not None and not self.low < self.high:
            raise ValueError("low must be below high")
        return self
