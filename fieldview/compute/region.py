"""Regions: the numbers of a contour or line on a measured field, each with its uncertainty.

The field between nodes is the bilinear interpolant of its cell; line and area integrals are exact for it.
"""

from __future__ import annotations

from dataclasses import replace

from fieldview.compute.budget import made, random_part, remarks, systematic_parts
from fieldview.compute.contour import Contour, percent
from fieldview.compute.field import Field
from fieldview.compute.numbers import Number
from fieldview.compute.pair_variance import PairVariance, pair_variance
from fieldview.compute.prepared import Prepared, prepare
from fieldview.compute.region_numbers import INTEGRALS, RegionNumbers, line_names
from fieldview.compute.region_parts import completed
from fieldview.compute.shapes import Shape

__all__ = ["Prepared", "RegionNumbers", "measure_region", "prepare", "quick_numbers"]


def measure_region(
    field: Field, shape: Shape, *, line: str = "bilinear", prepared: Prepared | None = None
) -> RegionNumbers:
    """Every number of a region on one field, with its full budget.

    Parameters
    ----------
    field : Field
    shape : Shape
        In the plane's coordinates.
    line : "bilinear" or "cubic"
        Interpolant along the contour. Either way the resolution gap is cubic minus bilinear.
    prepared : Prepared, optional
        Of the same field, from `prepare`; saves time where several regions are measured.
    """
    contour = Contour(shape, prepared or prepare(field))
    if contour.problem is not None:
        return _without_answer(contour)
    return _concluded(completed(_quick(contour, line), contour, line), field)


def quick_numbers(field: Field, shape: Shape, prepared: Prepared, *, line: str = "bilinear") -> RegionNumbers:
    """The numbers that follow a drag: the same ones by the same code, without the costly parts.

    Left out are gaps in the budgets, the random parts of area integrals, index and values inside.
    """
    contour = Contour(shape, prepared)
    if contour.problem is not None:
        return _without_answer(contour)
    return _concluded(_quick(contour, line), field)


def _quick(contour: Contour, line: str) -> RegionNumbers:
    numbers = _of_line(contour, line)
    return _of_area(numbers, contour) if contour.shape.closed else numbers


def _of_line(contour: Contour, line: str) -> RegionNumbers:
    """Length, coverage and the pair of line integrals with random and systematic parts."""
    field, shape = contour.prepared.field, contour.shape
    numbers = RegionNumbers(
        closed=shape.closed,
        length=Number(float(shape.length), field.units.of(1)),
        area=Number(float(shape.area), field.units.of(2)) if shape.closed else None,
        coverage={"contour": contour.contour_share, "area": None, "filled": contour.filled_share},
        warnings=() if contour.is_whole else (contour.obstacle,),
    )
    if not field.in_plane:
        return numbers
    names, unit = line_names(shape), field.units.circulation
    if not contour.is_whole:
        return replace(numbers, **dict.fromkeys(names, Number(None, unit)))
    weights = contour.line(line)
    pair, random = contour.prepared.of_pair(weights), pair_variance(weights, field)
    made_of = dict(zip(names, line_pair(contour, pair, random), strict=True))
    return replace(numbers, covariance=None if random is None else random.covariance, **made_of)


def line_pair(contour: Contour, pair: complex, random: PairVariance | None) -> tuple[Number, Number]:
    """Both line integrals; those of an open line feel a tilt of the axes and a common velocity error.

    Under a tilt each changes by the other. A velocity error of the same uncertainty in both components
    adds its product with the chord, whatever the line's way.
    """
    field = contour.prepared.field
    tilt, chord = 0j, 0.0
    if not contour.shape.closed:
        ends = contour.shape.vertices[[0, -1]]
        tilt, chord = complex(abs(pair.imag), abs(pair.real)), float(abs(ends[1] - ends[0]))
    variances = (None, None) if random is None else (random.first, random.second)
    return tuple(
        made(
            value,
            field.units.circulation,
            random_part(variance),
            systematic_parts(field, value, scale=2, tilt=change, offset=chord),
        )
        for value, variance, change in zip(
            (pair.real, pair.imag), variances, (tilt.real, tilt.imag), strict=True
        )
    )


def _of_area(numbers: RegionNumbers, contour: Contour) -> RegionNumbers:
    """Area integrals, closures and coverage of the area."""
    prepared = contour.prepared
    field = prepared.field
    warnings = list(numbers.warnings)
    share = contour.area_share
    found: dict = {"coverage": {**numbers.coverage, "area": share}}
    if share < 1 and contour.is_whole:
        warnings.append(f"{percent(1 - share)} of the area is not measured: the area integrals have no value")
    if field.in_plane:
        unit = field.units.circulation
        rates = None
        if share == 1 and contour.rate_share < 1:
            warnings.append(
                f"there is no vorticity on {percent(1 - contour.rate_share)} of the area: "
                "the integrals of vorticity and divergence have no value"
            )
        elif share == 1:
            rates = complex(prepared.rate_sums.integral(contour.rate_pieces))
        for name, closure, line, part in (
            ("vorticity_integral", "closure_circulation", numbers.circulation, "real"),
            ("divergence_integral", "closure_flux", numbers.flux, "imag"),
        ):
            value = None if rates is None else getattr(rates, part)
            found[name] = made(value, unit)
            both = value is not None and line.value is not None
            found[closure] = made(line.value - value if both else None, unit)
    if field.w is not None:
        flow = float(prepared.through_sums.integral(contour.area_pieces)) if share == 1 else None
        found["through_flow"] = made(flow, field.units.of(3, -1))
    return replace(numbers, warnings=tuple(warnings), **found)


def _without_answer(contour: Contour) -> RegionNumbers:
    """All values null, with the one reason."""
    field, shape = contour.prepared.field, contour.shape
    unit = field.units.circulation
    found = {}
    if field.in_plane:
        found = dict.fromkeys(line_names(shape), Number(None, unit))
        if shape.closed:
            found |= dict.fromkeys(INTEGRALS[2:6], Number(None, unit))
    if shape.closed and field.w is not None:
        found["through_flow"] = Number(None, field.units.of(3, -1))
    sound = shape.problem() is None
    return RegionNumbers(
        closed=shape.closed,
        length=Number(float(shape.length) if sound else None, field.units.of(1)),
        area=_area_of(shape, field, sound),
        coverage={"contour": None, "area": None, "filled": None},
        warnings=(contour.problem,),
        **found,
    )


def _area_of(shape: Shape, field: Field, sound: bool) -> Number | None:
    return Number(float(shape.area) if sound else None, field.units.of(2)) if shape.closed else None


def _concluded(numbers: RegionNumbers, field: Field) -> RegionNumbers:
    """The numbers with the remarks that belong to all of them."""
    said = [*numbers.warnings, *remarks(field, list(numbers.numbers().values())), *field.notes]
    return replace(numbers, warnings=tuple(dict.fromkeys(said)))
