"""The units that numbers are shown in: the session's own, millimetres, or multiples of reference values.

Only what is shown changes: sessions, exports and what is typed stay in the session's units.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from fieldview.publish import wording
from fieldview.session.models import Session

LENGTHS, TIMES = ("m", "px"), ("s", "pulse")
CHOICES = (("session", "as the session"), ("mm", "millimetres"), ("reference", "by reference values"))


@dataclass(frozen=True)
class UnitView:
    """Factors for lengths and times, and the names of what they are then measured in."""

    length: float = 1.0
    time: float = 1.0
    length_name: str | None = None
    time_name: str | None = None
    without_unit: bool = False

    def of(self, unit: str) -> tuple[float, str]:
        """Factor for a number in this unit, and the text of the unit it is then in."""
        powers = powers_of(unit)
        if powers is None:
            return 1.0, wording.unit_text(unit)
        long, late = powers
        factor = self.length**long * self.time**late
        if self.without_unit:
            return factor, ""
        text = unit
        if self.length_name:
            text = re.sub(r"\bm\b", self.length_name, text)
        return factor, wording.unit_text(text)

    def label(self, symbol: str, unit: str) -> str:
        """``Γ [mm²/s]``."""
        _, text = self.of(unit)
        return f"{symbol} [{text}]" if text else symbol


def unit_view(session: Session | None, choice: str) -> UnitView:
    """How numbers of this session are shown; as they are where the choice does not fit."""
    if session is None:
        return UnitView()
    if choice == "mm" and (session.units or "m, s") == "m, s":
        return UnitView(length=1e3, length_name="mm")
    length, velocity = session.reference.length, session.reference.velocity
    if choice == "reference" and length and velocity:
        return UnitView(length=1 / length, time=velocity / length, without_unit=True)
    return UnitView()


def powers_of(unit: str) -> tuple[int, int] | None:
    """Powers of length and time in a coherent unit such as ``m^2/s``; None for any other unit."""
    length = time = 0
    for place, part in enumerate(unit.split("/")):
        for word in part.split():
            found = re.fullmatch(r"([A-Za-z]+|1)(?:\^(\d+))?", word)
            if found is None:
                return None
            power = int(found.group(2) or 1) * (-1 if place else 1)
            if found.group(1) in LENGTHS:
                length += power
            elif found.group(1) in TIMES:
                time += power
            elif found.group(1) != "1":
                return None
    return length, time
