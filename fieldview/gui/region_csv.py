"""The regions of the shown frame as CSV, unrounded, by the very function of the command line."""

from __future__ import annotations

from fieldview.gui.picture import Picture
from fieldview.publish.tables import csv_lines


def regions_csv(picture: Picture) -> str:
    """One row a region, as ``loopflux measure --format csv`` writes it."""
    rows = [m.row for r in picture.regions if (m := picture.measured_of(r)) is not None]
    frame = {"frame": picture.shown.frame, "time": picture.field.time, "regions": rows}
    return "".join(f"{line}\n" for line in csv_lines([frame]))
