"""Maps over the nodes, written beside a field in a file whose ending says the format."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.quantities import quantity_map
from fieldview.files.writers import ENDINGS, writer
from fieldview.files.writing import said_if_unwritable

Values = dict[str, tuple[np.ndarray, str]]
"""Values (ny, nx) and unit by name."""


def quantity_values(field: Field, names: Iterable[str]) -> Values:
    """Quantities and, as NAME_uncertainty, their uncertainties."""
    values: Values = {}
    for name in names:
        made = quantity_map(field, name)
        values[name] = (made.values, made.unit)
        if made.uncertainty is not None:
            values[f"{name}_uncertainty"] = (made.uncertainty, made.unit)
    return values


def check_ending(path: Path | None) -> None:
    """Refuse a file of no known format before the work begins."""
    if path is not None and path.suffix[1:].lower() not in ENDINGS:
        raise InputError(f"{path}: the ending must be one of {', '.join(f'.{ending}' for ending in ENDINGS)}")


def write_maps(path: Path, field: Field, values: Values, *, session: Path) -> None:
    """Raises InputError where the file cannot be written."""
    check_ending(path)
    with said_if_unwritable(path):
        writer(path.suffix[1:].lower())(path, field, quantities=values, attributes={"session": session.name})
