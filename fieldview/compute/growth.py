"""How a region's numbers change as it grows, and the velocity around its contour."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fieldview.compute.contour import Contour
from fieldview.compute.field import Field
from fieldview.compute.numbers import Number
from fieldview.compute.prepared import Prepared, prepare
from fieldview.compute.region import quick_numbers
from fieldview.compute.shapes import Shape


@dataclass(frozen=True)
class GrowthCurve:
    """Circulation and flux (line integral and cross flow of an open line) at each factor.

    Attributes
    ----------
    factors : tuple of float
        By which the shape is scaled about its centroid.
    circulation, flux : tuple of Number
        With random and systematic parts; None as value where the contour is not wholly measured.
    """

    factors: tuple[float, ...]
    circulation: tuple[Number, ...]
    flux: tuple[Number, ...]


@dataclass(frozen=True, eq=False)
class Around:
    """The velocity along a contour or line at n places, in the order of travel.

    Attributes
    ----------
    arc_length : ndarray (n,)
        From the contour's first corner. [length]
    places : complex ndarray (n,)
        In the plane. [length]
    tangential, normal : ndarray (n,)
        Along the travel and to the right of it, which is outward on a closed contour; NaN where not
        measured. [velocity]
    """

    arc_length: np.ndarray
    places: np.ndarray
    tangential: np.ndarray
    normal: np.ndarray


def growth_curve(
    field: Field,
    shape: Shape,
    factors: Sequence[float],
    *,
    line: str = "bilinear",
    prepared: Prepared | None = None,
) -> GrowthCurve:
    """Circulation and flux of the shape scaled about its centroid.

    Parameters
    ----------
    field : Field
        With u and v.
    shape : Shape
        Closed; an open line has no growth to speak of, yet gets its integrals.
    factors : sequence of float
        Positive.
    """
    ready = prepared or prepare(field)
    found = [quick_numbers(field, shape.scaled(factor), ready, line=line) for factor in factors]
    none = Number(None, field.units.circulation)
    names = ("circulation", "flux") if shape.closed else ("line_integral", "cross_flow")
    first, second = (tuple(getattr(numbers, name) or none for numbers in found) for name in names)
    return GrowthCurve(tuple(float(factor) for factor in factors), first, second)


def around(field: Field, shape: Shape, *, prepared: Prepared | None = None) -> Around:
    """The bilinear velocity in the middle of every piece into which the grid cuts the contour."""
    contour = Contour(shape, prepared or prepare(field))
    if contour.problem is not None or not field.in_plane:
        nothing = np.zeros(0)
        return Around(nothing, nothing.astype(complex), nothing, nothing)
    pieces, measured = contour.pieces, contour.measured
    velocity = np.full(measured.size, np.nan, complex)
    a, b = pieces.a[measured], pieces.b[measured]
    shares = np.stack([(1 - a) * (1 - b), a * (1 - b), (1 - a) * b, a * b])
    velocity[measured] = (shares * contour.prepared.velocity[contour.corner_nodes]).sum(axis=0)
    lengths = pieces.lengths
    direction = pieces.dz / np.where(lengths > 0, lengths, 1.0)
    # conj(U) times the direction: along it, and to the right of it
    local = velocity.conj() * direction
    arc = np.cumsum(lengths) - 0.5 * lengths
    return Around(arc, pieces.places(), local.real, local.imag)
