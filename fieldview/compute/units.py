"""Coherent units inside the program: metres and seconds, or pixels and pulse separations."""

from __future__ import annotations

from dataclasses import dataclass

from fieldview.compute.errors import InputError


@dataclass(frozen=True)
class Units:
    """A coherent pair of base units; every number of a field is in products of their powers.

    ``str(units)`` is the form the session file uses, ``"m, s"`` or ``"px, pulse"``.
    """

    length: str = "m"
    time: str = "s"

    def __str__(self) -> str:
        return f"{self.length}, {self.time}"

    @classmethod
    def parse(cls, text: str) -> Units:
        """The units written as in a session file. Raises InputError on any other text."""
        for known in (METRIC, PIXEL):
            if "".join(text.split()) == "".join(str(known).split()):
                return known
        raise InputError(f'units are "{text}"; write "m, s" or "px, pulse"')

    def of(self, length: int = 0, time: int = 0) -> str:
        """Text of the unit with these powers: ``of(2, -1)`` is ``"m^2/s"``, ``of()`` is ``"1"``."""
        above = [_power(name, p) for name, p in ((self.length, length), (self.time, time)) if p > 0]
        below = [_power(name, -p) for name, p in ((self.length, length), (self.time, time)) if p < 0]
        return " ".join(above or ["1"]) + "".join(f"/{part}" for part in below)

    @property
    def velocity(self) -> str:
        return self.of(1, -1)

    @property
    def circulation(self) -> str:
        return self.of(2, -1)


def _power(name: str, power: int) -> str:
    return name if power == 1 else f"{name}^{power}"


METRIC = Units("m", "s")
PIXEL = Units("px", "pulse")
