"""Results as a table to read, as CSV or as JSON."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Iterable

import numpy as np

from fieldview.publish.tables import plain_text

FORMATS = ("table", "csv", "json")


def as_text(format: str, document: dict, rows: Iterable[dict], lines: Iterable[str]) -> str:
    """The same result in the format that was asked for.

    Parameters
    ----------
    format : "table", "csv" or "json"
    document : dict
        Everything, for JSON; what is not a number becomes null.
    rows : iterable of dict
        For CSV, all with the same keys.
    lines : iterable of str
        For reading.
    """
    if format == "json":
        return json.dumps(_strict(document), indent=1, ensure_ascii=False, allow_nan=False) + "\n"
    if format == "csv":
        return _csv(flat(_strict(row)) for row in rows)
    return "\n".join(lines) + "\n"


def flat(row: dict) -> dict:
    """A row without nested parts, which a table cannot hold."""
    flat = {}
    for key, value in row.items():
        if isinstance(value, dict):
            flat |= {f"{key}_{inner}": part for inner, part in value.items()}
        elif not isinstance(value, list):
            flat[key] = value
    return flat


def _csv(rows: Iterable[dict]) -> str:
    """Rows of the same keys as text with a header line."""
    out, writer = io.StringIO(), None
    for row in rows:
        if writer is None:
            writer = csv.DictWriter(out, row, lineterminator="\n")
            writer.writeheader()
        writer.writerow(
            {key: plain_text(cell) if isinstance(cell, str) else cell for key, cell in row.items()}
        )
    return out.getvalue()


def _strict(value):
    """NaN as null, all the way down."""
    if isinstance(value, dict):
        return {key: _strict(part) for key, part in value.items()}
    if isinstance(value, list | tuple):
        return [_strict(part) for part in value]
    if isinstance(value, float | np.floating):
        return float(value) if np.isfinite(value) else None
    return value
