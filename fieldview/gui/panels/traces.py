"""The chosen region's number over the frames measured so far."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from fieldview.gui.picture import Picture
from fieldview.publish.region_numbers import ENTRIES, Entry, figure

TRACED = {
    "circulation": (("circulation",), ("line_integral",), ("through_flow",)),
    "flux": (("flux",), ("cross_flow",), ("through_flow",)),
}
"""What is traced under each choice: of a contour, of a line, of a field that has only w."""

TRACE_WORDS = {"circulation": "Γ, ∫u·dl", "flux": "Φ, ∫u·n ds"}

_BY_KEY = {entry.key: entry for entry in ENTRIES}


def trace_of(picture: Picture, name: str) -> list[tuple[int, float, float | None]]:
    """The traced number of the frames measured so far: (frame, value, combined U)."""
    points = []
    for frame, row in _rows_of(picture, name):
        found = _traced(row, picture.shown.trace)
        if found is not None and found[1].value is not None:
            points.append((frame, found[1].value, found[1].uncertainty))
    return points


def trace_entry(picture: Picture, name: str) -> tuple[Entry, str] | None:
    """Which number is traced, and its unit; None while nothing is known."""
    for _, row in _rows_of(picture, name):
        found = _traced(row, picture.shown.trace)
        if found is not None:
            return found[0], found[1].unit
    return None


def _rows_of(picture: Picture, name: str) -> Iterator[tuple[int, Mapping]]:
    """Rows of a region, frame by frame, that are still those of the session as it is."""
    region = next((r for r in picture.regions if r.name == name), None)
    right: dict[int, bool] = {}
    for frame in sorted(picture.traces):
        traced = picture.traces[frame]
        still = right.setdefault(id(traced.basis), traced.basis.holds(picture.session, region))
        row = traced.rows.get(name) if still else None
        if row is not None:
            yield frame, row


def _traced(row: Mapping, choice: str):
    for key in TRACED[choice]:
        found = figure(row, key)
        if found is not None:
            return _BY_KEY[key], found
    return None
