"""The regions of the shown frame as CSV, unrounded, from the very rows of the command line."""

from __future__ import annotations

import csv
import io

from fieldview.gui.picture import Picture
from fieldview.gui.region_text import ENTRIES, figure

_PARTS = ("random", "systematic", "gaps", "combined")


def regions_csv(picture: Picture) -> str:
    """One row a region; every number with its unit and its standard uncertainties in columns of their own."""
    rows = [m.row for r in picture.regions if (m := picture.measured_of(r)) is not None]
    entries = [e for e in ENTRIES if any(figure(row, e.key) is not None for row in rows)]
    titles = ["region", "shape"]
    for entry in entries:
        name = "_".join(entry.key)
        titles += [name, f"{name}_unit"]
        if entry.spread:
            titles += [f"{name}_u_{part}" for part in _PARTS]
    titles += ["coverage_contour", "coverage_area", "coverage_filled", "index", "warnings"]
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(titles)
    for row in rows:
        writer.writerow(_line(row, entries))
    return out.getvalue()


def _line(row, entries) -> list:
    cells: list = [plain_text(row["name"]), row["shape"]]
    for entry in entries:
        number = figure(row, entry.key)
        cells += ["" if number is None else _digits(number.value), number.unit if number else ""]
        if entry.spread:
            spread = _at(row, entry.key).get("uncertainty") or {}
            cells += [_digits(spread.get(part)) for part in _PARTS]
    coverage = row.get("coverage") or {}
    cells += [_digits(coverage.get(key)) for key in ("contour", "area", "filled")]
    index = row.get("index")
    return [*cells, "" if index is None else index, plain_text("; ".join(row.get("warnings", ())))]


def plain_text(text: str) -> str:
    """Text that a spreadsheet will not take for a formula."""
    return f"'{text}" if text[:1] in ("=", "+", "-", "@") else text


def _at(row, key) -> dict:
    found = row
    for part in key:
        found = found.get(part) if isinstance(found, dict) else None
    return found if isinstance(found, dict) else {}


def _digits(value) -> str:
    return "" if value is None else repr(float(value))
