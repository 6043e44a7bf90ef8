"""The costly part of a region's numbers: gaps, uncertainty of area integrals, index, values inside."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from fieldview.compute.budget import filling_part, gap_part, made, random_part, systematic_parts
from fieldview.compute.contour import Contour
from fieldview.compute.fill_bias import fill_uncertainty
from fieldview.compute.inside import values_inside
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.numbers import Contribution, Number
from fieldview.compute.pair_variance import pair_variance, through_variance
from fieldview.compute.region_gaps import Gap, resolution_gap, window_gap
from fieldview.compute.region_numbers import RegionNumbers, line_names
from fieldview.compute.winding import index

NO_PLACE = "too few measured surroundings to punch its gaps into: the bias of filled vectors is not known"


def completed(numbers: RegionNumbers, contour: Contour, line: str) -> RegionNumbers:
    """The quick numbers with everything that they leave out."""
    field = contour.prepared.field
    if field.in_plane and contour.is_whole:
        window = window_gap(contour, contour.line(line))
        numbers = _with_line_gaps(numbers, contour, line, window)
    if not contour.shape.closed:
        return numbers
    if field.in_plane and contour.is_whole:
        number, reason = index(contour)
        numbers = _said(replace(numbers, index=number), reason)
    if contour.area_share < 1:
        return numbers
    if field.in_plane and contour.rate_share == 1:
        numbers = _with_area_budgets(numbers, contour, line, window if contour.is_whole else Gap(None))
    if field.w is not None:
        numbers = _with_through_budget(numbers, contour)
    return replace(numbers, inside=values_inside(contour, numbers.vorticity_integral))


def _said(numbers: RegionNumbers, *reasons: str) -> RegionNumbers:
    fresh = [reason for reason in reasons if reason and reason not in numbers.warnings]
    return replace(numbers, warnings=(*numbers.warnings, *fresh))


def _with_line_gaps(numbers: RegionNumbers, contour: Contour, line: str, window: Gap) -> RegionNumbers:
    first, second = line_names(contour.shape)
    weights = contour.line(line)
    resolution = resolution_gap(contour)
    filling, why = _filling(weights, contour)
    both = (getattr(numbers, first), getattr(numbers, second))
    made_of = _extended(both, _gap_parts(resolution, window, filling))
    gaps = dict(zip((first, second), _values(resolution), strict=True))
    return _said(
        replace(
            numbers,
            coverage={**numbers.coverage, "cubic": contour.cubic_share},
            resolution_gap=gaps,
            window_gap={first: _values(window)[0]},
            **dict(zip((first, second), made_of, strict=True)),
        ),
        resolution.reason,
        window.reason,
        why,
    )


def _with_area_budgets(numbers: RegionNumbers, contour: Contour, line: str, window: Gap) -> RegionNumbers:
    """Area integrals and closures with budgets.

    What the derivative scheme misses shows in the cubic line less the area integral: its resolution gap.
    The measuring window does to the area integrals what it does to the line's, by Stokes's and Gauss's
    theorems.
    """
    field = contour.prepared.field
    names = ("vorticity_integral", "divergence_integral")
    values = [getattr(numbers, name).value for name in names]
    areas = _budgeted(values, contour.rates, contour)
    whole = contour.is_whole
    resolution = resolution_gap(contour, contour.rates) if whole else Gap(None)
    filling, why = _filling(contour.rates, contour)
    areas = _extended(areas, _gap_parts(resolution, window, filling))
    found = dict(zip(names, areas, strict=True))
    if whole:
        closures = [numbers.closure_circulation.value, numbers.closure_flux.value]
        difference = contour.line(line) - contour.rates
        closures = _budgeted(closures, difference, contour)
        found |= dict(zip(("closure_circulation", "closure_flux"), closures, strict=True))
    return _said(replace(numbers, **found), window.reason, why) if field.in_plane else numbers


def _budgeted(values, weights: NodeWeights, contour: Contour) -> list[Number]:
    """A closed contour's pair of values with random and systematic parts."""
    field = contour.prepared.field
    random = pair_variance(weights, field)
    variances = (None, None) if random is None else (random.first, random.second)
    return [
        made(value, field.units.circulation, random_part(variance), systematic_parts(field, value, scale=2))
        for value, variance in zip(values, variances, strict=True)
    ]


def _with_through_budget(numbers: RegionNumbers, contour: Contour) -> RegionNumbers:
    """Scale counts three times, twice in the area and once in the velocity; an offset with the area."""
    field, flow = contour.prepared.field, numbers.through_flow
    block, corner = contour.area
    weights = NodeWeights.of_block(block, corner, contour.grid.shape[1])
    filling, why = _filling(weights, contour)
    number = made(
        flow.value,
        flow.unit,
        random_part(through_variance(weights, field)),
        systematic_parts(field, flow.value, scale=3, offset=float(block.sum())),
        filling_part(filling),
    )
    return _said(replace(numbers, through_flow=number), why)


def _filling(weights: NodeWeights, contour: Contour) -> tuple[complex | float | None, str]:
    filling = fill_uncertainty(weights, contour.prepared.field)
    return filling, NO_PLACE if filling is None else ""


def _gap_parts(resolution: Gap, window: Gap, filling) -> list[list[Contribution]]:
    """The gaps' contributions to the first and to the second number."""
    fill = (None, None) if filling is None else (filling.real, filling.imag)
    return [
        [gap_part("resolution", *of_resolution), gap_part("window", *of_window), filling_part(of_fill)]
        for of_resolution, of_window, of_fill in zip(
            (resolution.first, resolution.second), (window.first, window.second), fill, strict=True
        )
    ]


def _extended(numbers, parts) -> list[Number]:
    return [
        number if number.value is None else replace(number, budget=(*number.budget, *more))
        for number, more in zip(numbers, parts, strict=True)
    ]


def _values(gap: Gap) -> tuple[float | None, float | None]:
    if gap.value is None:
        return None, None
    return float(np.real(gap.value)), float(np.imag(gap.value))
