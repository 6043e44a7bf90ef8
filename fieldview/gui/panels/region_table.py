"""The rows of the Regions table, from the very rows that the command line prints."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from fieldview.gui.panels.tables import Cell
from fieldview.gui.picture import Picture
from fieldview.gui.region_text import scaled
from fieldview.publish import wording
from fieldview.publish.region_numbers import ENTRIES, Entry, figure

_BY_KEY = {entry.key: entry for entry in ENTRIES}


GAPS = ("resolution_gap", "window_gap")


@dataclass(frozen=True)
class Column:
    """A number of the table; a line's number stands in the place of the contour's it matches."""

    entries: tuple[Entry, ...]

    def found(self, row: Mapping):
        for entry in self.entries:
            number = figure(row, entry.key)
            if number is not None:
                return entry, number
        return self.entries[0], None


COLUMNS = tuple(
    Column(tuple(_BY_KEY[key] for key in keys))
    for keys in (
        (("circulation",), ("line_integral",)),
        (("flux",), ("cross_flow",)),
        (("through_flow",),),
        (("vorticity_integral",),),
        (("divergence_integral",),),
        (("closure", "circulation"),),
        (("closure", "flux"),),
        (("resolution_gap", "circulation"),),
        (("window_gap", "circulation"),),
        (("area",),),
        (("length",),),
    )
)


def table(picture: Picture) -> tuple[tuple[str, ...], tuple[tuple[Cell, ...], ...], tuple[str, ...]]:
    """Titles, rows of cells, and tips of the columns for the regions of a picture."""
    rows = [_row_of(picture, region) for region in picture.regions]
    columns = [c for c in COLUMNS if any(c.found(row)[1] is not None for row in rows)]
    titles, tips = ["region"], ["Name of the region; F2 or a double click renames"]
    filled: list[list[Cell]] = [
        [_name(region, row)] for region, row in zip(picture.regions, rows, strict=True)
    ]
    for column in columns:
        _add(titles, tips, filled, column, rows, picture)
    for title, tip, cells in (_shares(rows), _indices(rows), _cautions(rows)):
        titles.append(title)
        tips.append(tip)
        for line, cell in zip(filled, cells, strict=True):
            line.append(cell)
    return tuple(titles), tuple(tuple(line) for line in filled), tuple(tips)


def _row_of(picture: Picture, region) -> Mapping:
    measured = picture.measured_of(region)
    return measured.row if measured is not None else {}


def _name(region, row) -> Cell:
    warnings = "\n".join(row.get("warnings", ()))
    return Cell(region.name, region.name, tip=warnings or f"{region.shape}")


def _add(titles, tips, filled, column: Column, rows, picture: Picture) -> None:
    """A column of values and, where the number has one, a column of its uncertainty."""
    found = [column.found(row) for row in rows]
    unit = next(number.unit for _, number in found if number is not None)
    factor, _ = picture.unit_view.of(unit)
    main = column.entries[0]
    spread = main.spread and any(n is not None and n.uncertainty is not None for _, n in found)
    values, spreads = [], []
    beside = [figure(row, (column.entries[0].key[-1],)) for row in rows]
    k = picture.shown.coverage
    for (entry, number), owner in zip(found, beside, strict=True):
        expanded = None if number is None or number.uncertainty is None else k * number.uncertainty
        value = None if number is None else number.value
        text, u_text = wording.pair(*scaled(factor, value, expanded), signed=entry.signed)
        if number is not None and entry.key[0] in GAPS and owner is not None and owner.uncertainty:
            # a gap is judged against the U of the number it belongs to: one digit more than that shows
            decimals = wording.decimals_for(factor * owner.uncertainty) + 1
            text = wording.fixed(None if value is None else factor * value, decimals, signed=True)
        if number is None:
            text = u_text = ""
        muted = wording.is_noise(value, expanded) or picture.stale
        prefix = f"{entry.symbol} " if entry is not main and text else ""
        values.append((text, prefix, value, muted, entry.title))
        spreads.append((u_text if number is not None else "", expanded, muted))
    titles.append(picture.unit_view.label(main.symbol, unit))
    tips.append(main.title)
    texts = wording.aligned([text for text, *_ in values])
    for line, text, (_, prefix, value, muted, title) in zip(filled, texts, values, strict=True):
        line.append(Cell(prefix + text, value, right=True, muted=muted, tip=title))
    if spread:
        titles.append("± U")
        tips.append(f"Uncertainty of {main.symbol}, k = {k:g}")
        texts = wording.aligned([text for text, *_ in spreads])
        for line, text, (_, value, muted) in zip(filled, texts, spreads, strict=True):
            line.append(Cell(text, value, right=True, muted=muted))


def _shares(rows):
    cells = []
    for row in rows:
        coverage = row.get("coverage") or {}
        share, filled = coverage.get("contour"), coverage.get("filled")
        tip = f"{wording.percent(filled)} of the contour rests on filled vectors" if filled else ""
        cells.append(Cell(wording.percent(share) if row else "…", share, right=True, tip=tip))
    return "measured", "Share of the contour that lies where there are vectors", cells


def _indices(rows):
    cells = []
    for row in rows:
        index = row.get("index") if row.get("closed") else None
        text = "" if not row.get("closed") else "–" if index is None else f"{index:d}"
        cells.append(Cell(text.replace("-", wording.MINUS), index, right=True))
    return "index", "Winding number of the velocity along the contour", cells


def _cautions(rows):
    cells = []
    for row in rows:
        warnings = tuple(row.get("warnings", ()))
        more = f"  (+{len(warnings) - 1})" if len(warnings) > 1 else ""
        text = warnings[0] + more if warnings else ""
        cells.append(Cell(text, warnings, muted=True, tip="\n".join(warnings)))
    return "cautions", "What to bear in mind with these numbers", cells
