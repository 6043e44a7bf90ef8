"""A region's numbers in words, from the very row that the command line prints."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from fieldview.gui import wording
from fieldview.gui.units_shown import UnitView


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


TRACE_SYMBOLS = {"line": "∫u·dl"}
"""What is followed over time where it is not Γ."""


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


def label_lines(
    row: Mapping, *, coverage: float, full: bool, view: UnitView = UnitView()
) -> tuple[tuple[str, bool], ...]:
    """Lines for the label beside a region, each with whether it is mere noise."""
    wanted = [("circulation",), ("line_integral",), ("through_flow",)]
    if full:
        wanted = [e.key for e in ENTRIES[:5]] + [("closure", "circulation"), ("closure", "flux")]
    lines = []
    for entry in ENTRIES:
        found = figure(row, entry.key) if entry.key in wanted else None
        if found is None:
            continue
        spread = None if found.uncertainty is None else coverage * found.uncertainty
        factor, unit = view.of(found.unit)
        text = wording.plus_minus(*scaled(factor, found.value, spread), unit, signed=entry.signed)
        lines.append((f"{entry.symbol}  {text}", wording.is_noise(found.value, spread)))
    if not lines and row.get("warnings"):
        lines.append((shortened(row["warnings"][0]), True))
    return tuple(lines)


def scaled(factor: float, *numbers: float | None) -> tuple[float | None, ...]:
    """The numbers times a factor; what is not there stays so."""
    return tuple(None if n is None else factor * n for n in numbers)


def shortened(sentence: str, most: int = 60) -> str:
    """A sentence cut at a word, with an ellipsis, for narrow places."""
    if len(sentence) <= most:
        return sentence
    return sentence[:most].rsplit(" ", 1)[0] + " …"


def _unit_beside(row: Mapping, key: tuple[str, ...]) -> str:
    """The gaps are bare numbers in the row, in the unit of the number they belong to."""
    owner = row.get(key[-1])
    return owner.get("unit", "1") if isinstance(owner, Mapping) else "1"
