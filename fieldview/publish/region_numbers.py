"""The numbers of a region's row: where each stands in it, and how it is called."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass


@dataclass(frozen=True)
class Entry:
    """One number of a region's row: where it stands in the row, and how it is called."""

    key: tuple[str, ...]
    symbol: str
    title: str
    signed: bool = True
    spread: bool = True


ENTRIES = (
    Entry(("circulation",), "Γ", "Circulation ∮u·dl"),
    Entry(("flux",), "Φ", "Flux ∮u·n ds, outward"),
    Entry(("line_integral",), "∫u·dl", "Integral of the velocity along the line"),
    Entry(("cross_flow",), "∫u·n ds", "Flow across the line, to the right of travel"),
    Entry(("through_flow",), "∬w dA", "Flow through the area, across the plane"),
    Entry(("vorticity_integral",), "∬ω dA", "Area integral of the vorticity"),
    Entry(("divergence_integral",), "∬∇·u dA", "Area integral of the divergence"),
    Entry(("closure", "circulation"), "Γ − ∬ω", "Closure of the circulation: line minus area integral"),
    Entry(("closure", "flux"), "Φ − ∬∇·u", "Closure of the flux: line minus area integral"),
    Entry(("resolution_gap", "circulation"), "res. gap", "Resolution gap of Γ: cubic minus bilinear line"),
    Entry(("window_gap", "circulation"), "window gap", "Loss of Γ to the measuring window"),
    Entry(("area",), "area", "Area inside", signed=False, spread=False),
    Entry(("length",), "length", "Length of the contour or line", signed=False, spread=False),
)


def symbol(key: str) -> str:
    """How a number of a region's row is called in short."""
    return next(entry.symbol for entry in ENTRIES if entry.key == (key,))


@dataclass(frozen=True)
class Figure:
    """A number taken from a row: value, unit, uncertainty; None where the row has null."""

    value: float | None
    unit: str
    uncertainty: float | None


def figure(row: Mapping, key: tuple[str, ...]) -> Figure | None:
    """The number that stands at ``key``, or None where it does not apply."""
    found = row
    for part in key:
        found = found.get(part) if isinstance(found, Mapping) else None
        if found is None:
            return None
    if isinstance(found, Mapping):
        spread = found.get("uncertainty")
        combined = spread.get("combined") if isinstance(spread, Mapping) else None
        return Figure(found.get("value"), found.get("unit", "1"), combined)
    if isinstance(found, int | float):
        return Figure(float(found), _unit_beside(row, key), None)
    return None


def _unit_beside(row: Mapping, key: tuple[str, ...]) -> str:
    """The gaps are bare numbers in the row, in the unit of the number they belong to."""
    owner = row.get(key[-1])
    return owner.get("unit", "1") if isinstance(owner, Mapping) else "1"
