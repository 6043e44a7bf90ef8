"""How much of a region's numbers is the analyst: the same region under a grid of defensible choices.

Cleaning (threshold of the median test, method of filling), derivative scheme, interpolant along the line, and
the contour moved and scaled by half a spacing. Every combination is measured; the scatter stands beside the
measurement's own uncertainty, which it is no part of.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from itertools import product

import numpy as np

from fieldview.compute.field import Field
from fieldview.compute.numbers import Number
from fieldview.compute.region import measure_region, prepare, quick_numbers
from fieldview.compute.shapes import Shape
from fieldview.compute.stencils import SCHEMES
from fieldview.session.measure import NUMBERS, number_row, region_named
from fieldview.session.models import Session
from fieldview.session.regions import Region
from fieldview.session.replay import Frame
from fieldview.session.steps import Fill, MedianTest
from fieldview.session.wording import figure

THRESHOLDS = (0.75, 1.0, 1.5)
"""Factors on the session's own threshold: from strict to lenient (common practice, no source)."""

FILLINGS = ("linear", "harmonic", "biharmonic", "local_median")
LINES = ("bilinear", "cubic")

TITLES = {
    "threshold": "threshold of the median test",
    "filling": "method of filling",
    "derivative": "derivative scheme",
    "line": "interpolant along the line",
    "contour": "place and size of the contour",
}


@dataclass(frozen=True)
class Cleaning:
    """One way of cleaning: the session with it, and what was chosen by factor."""

    session: Session
    chosen: dict[str, str]


@dataclass(frozen=True)
class Study:
    """A region's numbers under every combination of choices.

    Attributes
    ----------
    region : str
    frame : int or str
    choices : dict of factor to tuple of str
        What was varied; the session's own choice stands first.
    rows : tuple of (choices, values)
        Values by the name of the number, None where there is none.
    reference : dict of name to Number
        With the session's own choices, and the full uncertainty.
    """

    region: str
    frame: Frame
    choices: dict[str, tuple[str, ...]]
    rows: tuple[tuple[dict[str, str], dict[str, float | None]], ...]
    reference: dict[str, Number]

    def summary(self) -> list[dict]:
        """One row for every number, in strict JSON: its value, its scatter, and which choice scatters it."""
        return [self._row(name, number) for name, number in self.reference.items()]

    def remarks(self) -> list[str]:
        said = [
            f"the {TITLES[factor]} is not varied: the ledger has none"
            for factor in ("threshold", "filling")
            if factor not in self.choices
        ]
        lost = sum(None in values.values() for _, values in self.rows)
        if lost:
            said.append(
                f"{lost} of {len(self.rows)} combinations have a number without a value and are left out"
            )
        return said

    def _row(self, name: str, number: Number) -> dict:
        values = self._values(name)
        spread = float(np.std(values, ddof=1)) if len(values) > 1 else None
        combined = number.combined
        return {
            "number": name,
            "measured": number_row(number),
            "combinations": len(values),
            "mean": float(np.mean(values)) if values else None,
            "deviation": spread,
            "lowest": min(values, default=None),
            "highest": max(values, default=None),
            "unit": number.unit,
            "deviation_over_uncertainty": spread / combined if spread is not None and combined else None,
            "alone": {factor: self._alone(name, factor) for factor in self.choices},
        }

    def _alone(self, name: str, factor: str) -> dict:
        """What one factor does while the others stay as the session has them."""
        others = {key: names[0] for key, names in self.choices.items() if key != factor}
        values = self._values(name, **others)
        return {
            "choices": list(self.choices[factor]),
            "deviation": float(np.std(values, ddof=1)) if len(values) > 1 else None,
            "range": max(values) - min(values) if values else None,
        }

    def _values(self, name: str, **fixed: str) -> list[float]:
        found = (
            values[name]
            for chosen, values in self.rows
            if all(chosen[key] == value for key, value in fixed.items())
        )
        return [value for value in found if value is not None]


def cleanings(session: Session) -> list[Cleaning]:
    """The session under every combination of thresholds and fillings, its own first.

    Every median test gets its own threshold times the factor; every fill the method.
    """
    tests = [step for step in session.ledger if isinstance(step, MedianTest) and step.on]
    fills = [step for step in session.ledger if isinstance(step, Fill) and step.on]
    factors = sorted(THRESHOLDS, key=lambda factor: factor != 1.0) if tests else [1.0]
    methods: list[str | None] = [None]
    if fills:
        own = fills[0].method
        methods = [own, *(method for method in FILLINGS if method != own)]
    found = []
    for factor, method in product(factors, methods):
        chosen = {}
        if tests:
            chosen["threshold"] = figure(factor * tests[0].threshold)
        if method is not None:
            chosen["filling"] = method
        ledger = tuple(_changed(step, factor, method) for step in session.ledger)
        found.append(Cleaning(session.model_copy(update={"ledger": ledger}), chosen))
    return found


def _changed(step, factor: float, method: str | None):
    if isinstance(step, MedianTest):
        return step.model_copy(update={"threshold": factor * step.threshold})
    if isinstance(step, Fill) and method is not None:
        return step.model_copy(update={"method": method})
    return step


def contours(shape: Shape, field: Field) -> dict[str, Shape]:
    """The shape itself, moved by half a spacing either way along both axes, and grown and shrunk by that."""
    half = [0.5 * float(np.median(np.diff(axis))) for axis in (field.grid.x, field.grid.y) if axis.size > 1]
    if not half:
        return {"as drawn": shape}
    turn = field.grid.placement.factor
    along = [half[0] * turn, half[-1] * 1j * turn]
    found = {"as drawn": shape}
    for step, axis in zip(along, ("x", "y"), strict=True):
        found |= {f"half a spacing along {sign}{axis}": shape.shifted(way * step) for sign, way in _WAYS}
    if shape.closed:
        # the radius of the circle of the same area grows by half a spacing
        radius, step = (shape.area / np.pi) ** 0.5, float(np.mean(half))
        found["half a spacing larger"] = shape.scaled(1 + step / radius)
        if step < radius:
            found["half a spacing smaller"] = shape.scaled(1 - step / radius)
    return found


_WAYS = (("+", 1), ("−", -1))


def measured_choices(
    session: Session, region: Region, field: Field, chosen: dict[str, str]
) -> Iterator[tuple]:
    """(choices, values) of one cleaned frame under every scheme, interpolant and contour."""
    shapes = contours(region.outline(), field)
    schemes = _own_first(session.derivative, SCHEMES) if region.outline().closed else [session.derivative]
    for scheme in schemes:
        ready = prepare(field.with_(derivative=scheme))
        for (place, shape), line in product(shapes.items(), _own_first(session.line, LINES)):
            numbers = quick_numbers(ready.field, shape, ready, line=line)
            values = {
                name: None if (number := getattr(numbers, attribute)) is None else number.value
                for name, attribute in NUMBERS.items()
                if getattr(numbers, attribute) is not None
            }
            yield chosen | {"derivative": scheme, "line": line, "contour": place}, values


def study(
    session: Session,
    region: str,
    frame: Frame,
    fields: Callable[[list[Cleaning]], Iterable[list[tuple]]],
    reference: Field,
) -> Study:
    """Put a study together.

    Parameters
    ----------
    session : Session
    region : str
    frame : int or str
    fields : callable (cleanings) -> for each the list of `measured_choices`
        Who replays and measures; see `fieldview.publish.studies`.
    reference : Field
        The frame with the session's own choices.

    Raises
    ------
    InputError
        There is no such region.
    """
    chosen = region_named(session, region)
    numbers = measure_region(reference, chosen.outline(), line=session.line)
    measured = {
        name: getattr(numbers, attribute)
        for name, attribute in NUMBERS.items()
        if getattr(numbers, attribute) is not None
    }
    rows = tuple(row for part in fields(cleanings(session)) for row in part)
    factors: dict[str, tuple[str, ...]] = {}
    for factor in TITLES:
        names = tuple(dict.fromkeys(row[factor] for row, _ in rows if factor in row))
        if names:
            factors[factor] = names
    return Study(region, frame, factors, rows, measured)


def _own_first(own: str, known: Iterable[str]) -> list[str]:
    return [own, *(name for name in known if name != own)]
