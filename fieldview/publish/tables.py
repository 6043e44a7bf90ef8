"""Tables of region numbers, from the very rows that `measure` gives."""

from __future__ import annotations

import csv
import io
import textwrap
from collections.abc import Iterable, Iterator, Mapping

from fieldview.publish import wording
from fieldview.publish.region_numbers import ENTRIES, Entry, figure

PARTS = ("random", "systematic", "gaps", "combined")
COVERAGE = ("contour", "area", "filled")


def csv_lines(rows: Iterable[Mapping]) -> Iterator[str]:
    """Lines of a CSV table, one a region and frame, unrounded.

    Every number has its unit and its standard uncertainties in columns of their own. The columns are
    chosen by the first frame, so that frames can stream.
    """
    yield from map(_joined, table_rows(rows))


def table_rows(rows: Iterable[Mapping]) -> Iterator[list]:
    """The same as cells: the titles first, numbers as numbers, empty text for what is not there."""
    entries: list[Entry] | None = None
    for row in rows:
        if entries is None:
            entries = [e for e in ENTRIES if any(figure(r, e.key) is not None for r in row["regions"])]
            yield _titles(entries)
        for region in row["regions"]:
            yield _cells(row, region, entries)


def text_lines(rows: Iterable[Mapping]) -> Iterator[str]:
    """The same for reading: every number rounded to two digits of its combined standard uncertainty."""
    for row in rows:
        time = "" if row["time"] is None else f", t = {wording.short(row['time'], digits=4)} s"
        yield f"frame {row['frame']}{time}"
        for region in row["regions"]:
            yield ""
            yield from _region_lines(region)
        yield ""


def plain_text(text: str) -> str:
    """Text that a spreadsheet will not take for a formula."""
    return f"'{text}" if text[:1] in ("=", "+", "-", "@") else text


def _titles(entries: list[Entry]) -> list[str]:
    titles = ["frame", "time_s", "region", "shape"]
    for entry in entries:
        name = "_".join(entry.key)
        titles += [name, f"{name}_unit"]
        if entry.spread:
            titles += [f"{name}_u_{part}" for part in PARTS]
    return [*titles, *(f"coverage_{part}" for part in COVERAGE), "index", "warnings"]


def _cells(row: Mapping, region: Mapping, entries: list[Entry]) -> list:
    cells: list = [row["frame"], _digits(row["time"]), plain_text(region["name"]), region["shape"]]
    for entry in entries:
        number = figure(region, entry.key)
        cells += ["" if number is None else _digits(number.value), number.unit if number else ""]
        if entry.spread:
            spread = _uncertainty(region, entry)
            cells += [_digits(spread.get(part)) for part in PARTS]
    coverage = region.get("coverage") or {}
    index = region.get("index")
    cells += [_digits(coverage.get(key)) for key in COVERAGE]
    return [*cells, "" if index is None else index, plain_text("; ".join(region.get("warnings", ())))]


def _region_lines(region: Mapping) -> Iterator[str]:
    coverage = region.get("coverage") or {}
    shares = ", ".join(
        f"{word} {wording.percent(coverage[key])}"
        for key, word in (("contour", "contour measured"), ("area", "area measured"), ("filled", "filled"))
        if coverage.get(key) is not None
    )
    yield f"  {region['name']} ({region['shape']}){': ' + shares if shares else ''}"
    for entry in ENTRIES:
        number = figure(region, entry.key)
        if number is None:
            continue
        spread = _uncertainty(region, entry)
        shown = wording.plus_minus(number.value, number.uncertainty, number.unit, signed=entry.signed)
        if not spread:
            shown = f"{wording.short(number.value, digits=4)} {wording.unit_text(number.unit)}".rstrip()
        decimals = wording.decimals_for(number.uncertainty)
        parts = ", ".join(
            f"{part} {wording.fixed(spread[part], decimals)}"
            for part in PARTS[:-1]
            if number.uncertainty is not None and spread.get(part) is not None
        )
        yield f"    {entry.symbol:<10} {shown:<32} {parts}".rstrip()
    if region.get("index") is not None:
        yield f"    {'index':<10} {region['index']}"
    for warning in region.get("warnings", ()):
        yield from textwrap.wrap(warning, 98, initial_indent="    ! ", subsequent_indent="      ")


def _uncertainty(region: Mapping, entry: Entry) -> Mapping:
    found = region
    for part in entry.key:
        found = found.get(part) if isinstance(found, Mapping) else None
    return (found.get("uncertainty") or {}) if isinstance(found, Mapping) else {}


def _joined(cells: list) -> str:
    out = io.StringIO()
    csv.writer(out, lineterminator="").writerow(cells)
    return out.getvalue()


def _digits(value) -> float | str:
    """A number that is written with all its digits, or nothing."""
    return "" if value is None else float(value)
