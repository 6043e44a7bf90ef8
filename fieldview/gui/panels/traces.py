"""The chosen region's number over the frames measured so far."""

from __future__ import annotations

from fieldview.gui.picture import Picture
from fieldview.publish.region_numbers import figure

TRACE_KEYS = (("circulation",), ("line_integral",), ("through_flow",))


def trace_of(picture: Picture, name: str) -> list[tuple[int, float, float | None]]:
    """Γ (or what a region has instead) of the frames measured so far: (frame, value, combined U)."""
    points = []
    region = next((r for r in picture.regions if r.name == name), None)
    right: dict[int, bool] = {}
    for frame in sorted(picture.traces):
        traced = picture.traces[frame]
        still = right.setdefault(id(traced.basis), traced.basis.holds(picture.session, region))
        row = traced.rows.get(name) if still else None
        if row is None:
            continue
        found = next((f for key in TRACE_KEYS if (f := figure(row, key)) is not None), None)
        if found is not None and found.value is not None:
            points.append((frame, found.value, found.uncertainty))
    return points
