"""A region's numbers in words, from the very row that the command line prints."""

from __future__ import annotations

from collections.abc import Mapping

from fieldview.publish import wording
from fieldview.publish.region_numbers import ENTRIES, figure
from fieldview.publish.units_shown import UnitView


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
