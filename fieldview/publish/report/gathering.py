"""Everything the report shows, as plain texts."""

from __future__ import annotations

import base64
import platform
from collections import Counter
from importlib.metadata import version

import numpy as np

import fieldview
from fieldview.compute.stencils import SCHEMES
from fieldview.publish import wording
from fieldview.publish.figures import caption, draw, picture
from fieldview.publish.figures.captions import uncertainty_statement
from fieldview.publish.figures.drawing import first_quantity
from fieldview.publish.region_numbers import ENTRIES, figure, symbol
from fieldview.session.choices import TITLES, Study
from fieldview.session.figures import WIDTHS, FigureSettings
from fieldview.session.measure import NUMBERS
from fieldview.session.models import Session
from fieldview.session.replay import Frame, Workbench

LIBRARIES = ("numpy", "scipy", "pandas", "xarray", "h5py", "pint", "pydantic", "shapely", "matplotlib")

_FULL_BAR = 120
"""Length of a bar that is all of the variance. [px]"""


def run_facts(bench: Workbench) -> list[tuple[str, str]]:
    """Name and value of what is to be known of the run."""
    run, units = bench.run, bench.units
    grid = bench.field(0).grid
    nx, ny = grid.x.size, grid.y.size
    spacing = " × ".join(f"{step:.4g}" for step in grid.spacing)
    facts = [
        ("frames", str(len(run))),
        ("grid", f"{nx} × {ny} nodes, mean spacing {spacing} {units.length}"),
        ("components", ", ".join(bench.field(0).components)),
        ("units", str(units)),
    ]
    if run.reading.frame_interval is not None:
        facts.append(("frame interval", f"{run.reading.frame_interval:g} s"))
    return facts


def reading_facts(session: Session) -> list[tuple[str, str]]:
    """What was stated because the files do not say it."""
    stated = session.run.reading.model_dump(mode="json", exclude_defaults=True)
    return [(name.replace("_", " "), _words(value)) for name, value in stated.items()]


def error_facts(bench: Workbench, field) -> list[tuple[str, str]]:
    """Sigma, correlation, window and systematic parts, each with its unit."""
    error, unit = field.error, wording.unit_text(field.units.velocity)
    facts = []
    for name in field.components:
        sigma = error.sigma_of(name, field.grid.shape)
        if sigma is not None:
            middle = float(np.nanmedian(sigma))
            varies = "" if np.nanmin(sigma) == np.nanmax(sigma) else " (median over the nodes)"
            facts.append((f"sigma of {name}", f"{wording.short(middle)} {unit}{varies}, {error.origin}"))
    nodes = " × ".join(f"{part:.4g}" for part in error.correlation)
    facts.append(("correlation", f"{nodes} nodes" + ("" if error.correlation_stated else ", not stated")))
    if error.window is not None:
        size = " × ".join(f"{part:.4g}" for part in error.window)
        facts.append(("measuring window", f"{size} {field.units.length}"))
    parts = bench.session.error_model.systematic
    for name, value in parts.model_dump().items():
        shown = "not stated" if value is None else f"{value:g}"
        if value is not None and name == "zero_offset":
            shown += f" {unit}"
        facts.append((name.replace("_", " "), shown))
    return facts


def ledger_lines(bench: Workbench, frames: list[Frame]) -> list[dict]:
    """Every line's sentence, and its counts summed over the frames by number."""
    numbers = [frame for frame in frames if isinstance(frame, int)]
    totals: list[Counter] = [Counter() for _ in bench.session.ledger]
    told = []
    for frame in numbers or [0]:
        told = bench.tallies(frame)
        for total, tally in zip(totals, told, strict=True):
            total.update(tally.counts)
    return [
        {
            "sentence": tally.sentence + ("" if step.on else " (switched off)"),
            "counts": ", ".join(f"{count:,} {word}" for word, count in total.items()),
        }
        for step, tally, total in zip(bench.session.ledger, told, totals, strict=True)
    ]


def region_tables(session: Session, rows: list[dict]) -> list[dict]:
    """For every region its table over the frames, and the budgets of the first of them."""
    return [_region_table(place, rows) for place in range(len(session.regions))]


def _region_table(place: int, rows: list[dict]) -> dict:
    entries = [row["regions"][place] for row in rows]
    first = entries[0]
    keys = [key for key in NUMBERS if key in first]
    titles = [wording.with_unit(symbol(key), first[key]["unit"]) for key in keys]
    tables = [
        {
            "titles": [*titles, "measured"],
            "rows": [
                {
                    "frame": row["frame"],
                    "cells": [
                        *(_cell(entry[key]) for key in keys),
                        wording.percent(entry["coverage"].get("contour")),
                    ],
                }
                for row, entry in zip(rows, entries, strict=True)
            ],
        }
    ]
    checks = _checks(rows, entries)
    warnings = dict.fromkeys(said for entry in entries for said in entry["warnings"])
    return {
        "name": first["name"],
        "shape": first["shape"],
        "tables": [*tables, checks] if checks["titles"] else tables,
        "budgets": [_budget(key, first) for key in keys if first["budget"].get(key)],
        "warnings": list(warnings),
    }


def _checks(rows: list[dict], entries: list[dict]) -> dict:
    """Closures and gaps of a region: what tells whether the grid resolves the flow."""
    names = ("closure", "resolution_gap", "window_gap")
    shown = [
        entry for entry in ENTRIES if entry.key[0] in names and figure(entries[0], entry.key) is not None
    ]
    unit = next((found.unit for entry in shown if (found := figure(entries[0], entry.key)).unit != "1"), "1")
    return {
        "titles": [wording.with_unit(entry.symbol, unit) for entry in shown],
        "rows": [
            {"frame": row["frame"], "cells": [_check(figure(entry, check.key)) for check in shown]}
            for row, entry in zip(rows, entries, strict=True)
        ],
    }


def _check(found) -> str:
    if found is None or found.value is None:
        return "no value"
    if found.uncertainty is None:
        return wording.short(found.value, digits=2)
    return " ± ".join(wording.pair(found.value, found.uncertainty))


def _cell(number: dict) -> str:
    if number["value"] is None:
        return "no value"
    combined = number["uncertainty"]["combined"]
    shown, spread = wording.pair(number["value"], combined)
    return shown if combined is None else f"{shown} ± {spread}"


def _budget(key: str, entry: dict) -> dict:
    number, parts = entry[key], entry["budget"][key]
    total = sum((part["uncertainty"] or 0.0) ** 2 for part in parts)
    lines = []
    for part in sorted(parts, key=lambda part: -(part["uncertainty"] or 0.0)):
        known = part["uncertainty"]
        share = known**2 / total if known is not None and total > 0 else None
        lines.append(
            {
                "name": part["part"].replace("_", " "),
                "kind": part["kind"],
                "uncertainty": "not stated" if known is None else wording.short(known, digits=2),
                "share": "" if share is None else wording.percent(share),
                "percent": 0 if share is None else round(_FULL_BAR * share),
            }
        )
    shown = wording.plus_minus(number["value"], number["uncertainty"]["combined"], number["unit"])
    return {"symbol": symbol(key), "shown": shown, "parts": lines}


def study_table(study: Study) -> dict:
    """A choices study in short."""
    rows = []
    for row in study.summary():
        alone = {factor: part["deviation"] or 0.0 for factor, part in row["alone"].items()}
        most = max(alone, key=alone.get, default=None)
        deviation = row["deviation"]
        measured = row["measured"]
        rows.append(
            {
                "symbol": symbol(row["number"]),
                "measured": wording.plus_minus(
                    measured["value"], measured["uncertainty"]["combined"], row["unit"]
                ),
                "deviation": "–"
                if deviation is None
                else f"{wording.short(deviation, digits=2)} {wording.unit_text(row['unit'])}",
                "ratio": wording.short(row["deviation_over_uncertainty"], digits=2),
                "most": TITLES[most] if most and alone[most] > 0 else "nothing",
            }
        )
    return {"region": study.region, "rows": rows, "remarks": study.remarks()}


def report_figures(bench: Workbench, frames: list[Frame]) -> list[dict]:
    """The session's own figures, or a map, the growth of the first closed region and its run over time."""
    wanted = list(bench.session.figures)
    if not wanted:
        wide = WIDTHS["two"]
        field = bench.field(frames[0])
        name = first_quantity(field)
        wanted = [FigureSettings(name="map", quantities=(name,), frames=str(frames[0]), width_mm=wide)]
        closed = [region for region in bench.session.regions if region.outline().closed]
        if closed and field.in_plane:
            curve = {"region": closed[0].name, "frames": str(frames[0]), "width_mm": 120.0}
            wanted.append(FigureSettings(name="growth", kind="growth", **curve))
            if len(bench.run) > 2:
                wanted.append(FigureSettings(name="time", kind="time", **curve))
    return [_drawn(bench, settings) for settings in wanted]


def _drawn(bench: Workbench, settings: FigureSettings) -> dict:
    content = picture(draw(bench, settings), settings, "svg")
    return {
        "alt": settings.title or f"{settings.kind} of {bench.session.title or 'the run'}",
        "data": base64.b64encode(content).decode(),
        "caption": caption(bench, settings).strip(),
    }


def error_statement(field) -> str:
    return uncertainty_statement(field)


def derivative_title(session: Session) -> str:
    return SCHEMES[session.derivative].title.lower()


def versions() -> str:
    """Program, language and the libraries that compute."""
    parts = [f"Loopflux {fieldview.__version__}", f"Python {platform.python_version()}"]
    return ", ".join([*parts, *(f"{name} {version(name)}" for name in LIBRARIES)])


def _words(value) -> str:
    if isinstance(value, dict):
        return ", ".join(f"{key}: {part}" for key, part in value.items())
    if isinstance(value, list):
        return ", ".join(map(str, value))
    return str(value)
