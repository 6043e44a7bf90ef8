"""Everything known of one region on one frame."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from fieldview.compute.numbers import Number
from fieldview.compute.shapes import Shape

INTEGRALS = (
    "circulation",
    "flux",
    "vorticity_integral",
    "divergence_integral",
    "closure_circulation",
    "closure_flux",
    "through_flow",
    "line_integral",
    "cross_flow",
)
"""Attributes that hold integrals, in order."""


@dataclass(frozen=True)
class RegionNumbers:
    """Everything known of one region on one frame.

    A number that does not apply is None; one that cannot be had has the value None, and its reason is among
    the warnings.

    Attributes
    ----------
    closed : bool
    length, area : Number
        Of the contour itself; an open line has no area. [length], [length^2]
    coverage : mapping
        Shares 0 ... 1: "contour" of the length that is measured, "area" likewise, "filled" of the length
        in cells with a filled corner, "cubic" of the length on which the cubic line is cubic.
    circulation, flux : Number
        Line integrals of the velocity along a closed contour and across it, outward. [length^2/time]
    vorticity_integral, divergence_integral : Number
        Area integrals of the field's derivative scheme. [length^2/time]
    closure_circulation, closure_flux : Number
        Line minus area integral. [length^2/time]
    through_flow : Number
        Area integral of w. [length^3/time]
    line_integral, cross_flow : Number
        Of an open line, along it and across it to the right of travel. [length^2/time]
    resolution_gap : mapping of "circulation", "flux" (or "line_integral", "cross_flow") to float or None
        Cubic minus bilinear line.
    window_gap : mapping of "circulation" (or "line_integral") to float or None
        What averaging over the measuring window does to the number; None if not estimable.
    index : int or None
        Winding number of the velocity along the closed contour.
    inside : mapping of quantity to mapping of "mean", "min", "max" to Number
    covariance : float or None
        Random covariance of circulation and flux (line_integral and cross_flow). [length^4/time^2]
    warnings : tuple of str
    """

    closed: bool
    length: Number
    area: Number | None = None
    coverage: Mapping[str, float | None] = field(default_factory=dict)
    circulation: Number | None = None
    flux: Number | None = None
    vorticity_integral: Number | None = None
    divergence_integral: Number | None = None
    closure_circulation: Number | None = None
    closure_flux: Number | None = None
    through_flow: Number | None = None
    line_integral: Number | None = None
    cross_flow: Number | None = None
    resolution_gap: Mapping[str, float | None] = field(default_factory=dict)
    window_gap: Mapping[str, float | None] = field(default_factory=dict)
    index: int | None = None
    inside: Mapping[str, Mapping[str, Number]] = field(default_factory=dict)
    covariance: float | None = None
    warnings: tuple[str, ...] = ()

    def numbers(self) -> dict[str, Number]:
        """The integrals that apply, by attribute name."""
        return {name: getattr(self, name) for name in INTEGRALS if getattr(self, name) is not None}


def line_names(shape: Shape) -> tuple[str, str]:
    return ("circulation", "flux") if shape.closed else ("line_integral", "cross_flow")
