"""A number that can be defended: value, unit, and what its uncertainty is made of."""

from __future__ import annotations

import math
from dataclasses import dataclass


@dataclass(frozen=True)
class Contribution:
    """One line of an uncertainty budget.

    Attributes
    ----------
    name : str
        "random", "scale", "pulse_separation", "gain", "axis_tilt", "zero_offset", "resolution",
        "window" or "filling".
    kind : str
        "random", "systematic" or "gaps".
    sensitivity : float or None
        Change of the value per unit of the input, where there is one.
    uncertainty : float or None
        Standard uncertainty contributed, in the unit of the value; None where it is not known.
    """

    name: str
    kind: str
    sensitivity: float | None
    uncertainty: float | None


@dataclass(frozen=True)
class Number:
    """A value with unit and budget; ``value`` is None where it cannot be had."""

    value: float | None
    unit: str
    budget: tuple[Contribution, ...] = ()

    def part(self, kind: str) -> float | None:
        """Root of the squares of the known contributions of one kind; None if none is known."""
        return _root([c.uncertainty for c in self.budget if c.kind == kind])

    @property
    def random(self) -> float | None:
        return self.part("random")

    @property
    def systematic(self) -> float | None:
        return self.part("systematic")

    @property
    def gaps(self) -> float | None:
        return self.part("gaps")

    @property
    def combined(self) -> float | None:
        """Combined standard uncertainty; None where the random part is unknown, since no sigma was given."""
        if self.random is None:
            return None
        return _root([c.uncertainty for c in self.budget])


def _root(parts: list[float | None]) -> float | None:
    known = [p for p in parts if p is not None]
    return math.sqrt(math.fsum(p * p for p in known)) if known else None
