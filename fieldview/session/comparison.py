"""Two frames side by side: their difference with its uncertainty, node by node and region by region.

Random errors of the two are taken as independent. Systematic ones are not: the same calibration drops out of
a difference, two calibrations do not. Which holds is the user's to say.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.numbers import Contribution, Number
from fieldview.compute.quantities import quantity_map
from fieldview.compute.region import measure_region
from fieldview.session.measure import NUMBERS, number_row
from fieldview.session.models import Session


@dataclass(frozen=True, eq=False)
class Comparison:
    """The second frame less the first.

    Attributes
    ----------
    difference : Field
        At nodes with a vector in both; its sigma is the root of the squares of both.
    uncertainties : dict of component to ndarray (ny, nx), or None where a sigma is not known
        Random standard uncertainty of the difference. [velocity]
    coverage_factor : float
        k of the share beyond k U.
    regions : dict of name to dict of number to (first, second, difference)
        The first session's regions, measured on both.
    shared_calibration : bool
        Whether systematic errors are common to both.
    """

    difference: Field
    uncertainties: dict[str, np.ndarray | None]
    coverage_factor: float
    regions: dict[str, dict[str, tuple[Number, Number, Number]]]
    shared_calibration: bool

    def component_rows(self) -> list[dict]:
        """One row for every component, in strict JSON."""
        return [self._component(name) for name in self.difference.components]

    def region_rows(self) -> list[dict]:
        """One row for every number of every region, in strict JSON."""
        return [
            {
                "region": region,
                "number": name,
                "first": number_row(first),
                "second": number_row(second),
                "difference": number_row(difference),
                "beyond": self._beyond(difference),
            }
            for region, numbers in self.regions.items()
            for name, (first, second, difference) in numbers.items()
        ]

    def _component(self, name: str) -> dict:
        both = self.difference.valid
        values, spread = self.difference.components[name][both], self.uncertainties[name]
        row = {
            "component": name,
            "unit": self.difference.units.velocity,
            "nodes": int(both.sum()),
            "nodes_of_grid": int(both.size),
            "mean": float(values.mean()),
            "deviation": float(values.std(ddof=1)) if values.size > 1 else None,
            "largest": float(np.abs(values).max()),
            "expected_deviation": None,
            "share_beyond": None,
            "coverage_factor": self.coverage_factor,
        }
        if spread is not None:
            known = spread[both]
            row["expected_deviation"] = float(np.sqrt(np.mean(known**2)))
            row["share_beyond"] = float(np.mean(np.abs(values) > self.coverage_factor * known))
        return row

    def _beyond(self, difference: Number) -> bool | None:
        if difference.value is None or difference.combined is None:
            return None
        return bool(abs(difference.value) > self.coverage_factor * difference.combined)


def compare(
    session: Session,
    first: Field,
    second: Field,
    *,
    coverage_factor: float = 2.0,
    shared_calibration: bool = False,
) -> Comparison:
    """Compare two frames on the same nodes; the regions are the session's.

    Parameters
    ----------
    session : Session
        Of the first frame.
    first, second : Field
    coverage_factor : float
        k from which a difference counts as more than its uncertainty.
    shared_calibration : bool
        Whether scale, pulse separation, gain, tilt and offset are the same error in both: what they do to
        the difference is then the difference of what they do.

    Raises
    ------
    InputError
        The frames are not on the same nodes, in the same units or have no component in common.
    """
    if not coverage_factor > 0:
        raise InputError(f"the coverage factor is {coverage_factor}; give a positive one")
    if first.units != second.units:
        raise InputError(
            f'the first frame is in "{first.units}", the second in "{second.units}"; calibrate both alike'
        )
    if not first.grid.same_nodes(second.grid):
        raise InputError(
            "the two frames are not on the same nodes; a difference needs one grid, "
            "so compare runs of one set-up or their region tables"
        )
    names = [name for name in first.components if name in second.components]
    if not names:
        raise InputError("the two frames have no component in common")
    spreads = {name: _together(first, second, name) for name in names}
    return Comparison(
        _difference(first, second, names, spreads),
        spreads,
        coverage_factor,
        _regions(session, first, second, shared_calibration),
        shared_calibration,
    )


def _together(first: Field, second: Field, name: str) -> np.ndarray | None:
    parts = [quantity_map(field, name).uncertainty for field in (first, second)]
    return None if None in [None if part is None else 0 for part in parts] else np.hypot(*parts)


def _difference(first: Field, second: Field, names, spreads) -> Field:
    both = first.valid & second.valid
    parts = {name: np.where(both, second.components[name] - first.components[name], np.nan) for name in names}
    known = {name: np.where(both, spread, 0.0) for name, spread in spreads.items() if spread is not None}
    error = ErrorModel(
        sigma=known or None,
        origin=first.error.origin,
        correlation=first.error.correlation,
        correlation_stated=first.error.correlation_stated and second.error.correlation_stated,
    )
    absent = dict.fromkeys(set(first.components) - set(names))
    status = np.where(both, np.uint8(Status.MEASURED), np.uint8(Status.MISSING))
    return first.with_(
        **parts,
        **absent,
        status=status,
        measured=parts,
        channels={},
        channel_units={},
        time=None,
        maps=(),
        events=(),
        error=error,
        notes=("difference of two frames, the second less the first",),
    )


def _regions(session, first: Field, second: Field, shared: bool):
    found = {}
    for region in session.regions:
        both = [measure_region(field, region.outline(), line=session.line) for field in (first, second)]
        numbers = {}
        for name, attribute in NUMBERS.items():
            one, other = (getattr(numbers_of, attribute) for numbers_of in both)
            if one is not None and other is not None:
                numbers[name] = (one, other, _less(one, other, shared))
        found[region.name] = numbers
    return found


def _less(one: Number, other: Number, shared: bool) -> Number:
    """Second less first: independent parts as the root of the squares, shared ones as their difference."""
    if one.value is None or other.value is None:
        return Number(None, one.unit)
    theirs = {part.name: part for part in other.budget}
    budget = []
    for part in one.budget:
        match = theirs.get(part.name)
        budget.append(replace(part, uncertainty=_both(part, match, shared), sensitivity=None))
    return Number(other.value - one.value, one.unit, tuple(budget))


def _both(part: Contribution, other: Contribution | None, shared: bool) -> float | None:
    if part.uncertainty is None or other is None or other.uncertainty is None:
        return None
    if part.kind != "systematic" or not shared:
        return float(np.hypot(part.uncertainty, other.uncertainty))
    if part.sensitivity is None or other.sensitivity is None or part.sensitivity == 0:
        return abs(part.uncertainty - other.uncertainty)
    # the same error of the input, felt through two sensitivities
    scale = part.uncertainty / abs(part.sensitivity)
    return scale * abs(part.sensitivity - other.sensitivity)
