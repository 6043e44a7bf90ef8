"""NPZ containers of numpy."""

from __future__ import annotations

import io
import json
import zipfile
import zlib
from collections.abc import Mapping
from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.files.contents import Contents, Variable, unnamed_dims, whole
from fieldview.files.writing import remarks_of, said_by_remarks, values_of, write_whole

SUFFIXES = (".npz",)


def read(path: Path) -> Contents:
    """The arrays of a container; pickled objects are never loaded.

    Units are taken from ``units``, a JSON text of names and units, where there is one.
    """
    try:
        with np.load(path, allow_pickle=False) as container:
            arrays = {name: container[name] for name in container.files}
    except (OSError, ValueError, EOFError, KeyError, zipfile.BadZipFile, zlib.error) as error:
        why = (
            "holds pickled objects, which are not loaded"
            if "pickle" in str(error)
            else "is cut off or damaged"
        )
        raise InputError(f"{path.name}: {why}; export plain arrays again") from None
    units = _json(arrays.pop("units", None))
    remarks = [str(line) for line in np.ravel(arrays.pop("remarks", []))]
    stated = said_by_remarks(remarks)
    return contents_of(path, "NPZ container", arrays, units, stated)


def contents_of(
    path: Path, kind: str, arrays: Mapping[str, np.ndarray], units: Mapping[str, str], stated
) -> Contents:
    """Contents of a container that is a set of named arrays with nothing else said of them."""
    variables, notes = [], []
    for name, array in arrays.items():
        if array.dtype.kind not in "fiub" or array.size == 0:
            notes.append(f'"{name}" holds no numbers and is not read')
            continue
        values = np.asarray(array, float)
        variables.append(
            Variable(
                name,
                units.get(name),
                unnamed_dims(values.shape),
                values.shape,
                whole(values),
                samples=tuple(f"{value:g}" for value in np.ravel(values)[:3]),
                attributes={"role": name if stated and name == "status" else None},
            )
        )
    if not variables:
        raise InputError(f"{path.name}: holds no arrays of numbers; a field needs x, y and a component")
    rows = (("name", "shape"), *((v.name, " x ".join(map(str, v.shape))) for v in variables))
    return Contents(path, kind, tuple(variables), tuple(notes), rows, stated)


def write_npz(
    path: str | Path,
    field: Field,
    *,
    quantities: Mapping[str, tuple[np.ndarray, str]] | None = None,
    attributes: Mapping[str, str] | None = None,
) -> None:
    """Write one field as arrays [y, x] with their units; no pickles, the same field gives the same bytes.

    Positions are lists along the axes; where the axes were turned, arrays in plane coordinates.
    """
    values = values_of(field, quantities)
    arrays = {name: np.asarray(array) for name, (array, _) in values.items()}
    if field.grid.placement.is_identity:
        arrays |= {"x": field.grid.x, "y": field.grid.y}
    arrays["units"] = np.array(json.dumps({name: unit for name, (_, unit) in values.items()}))
    arrays["remarks"] = np.array(remarks_of(field, attributes))
    stream = io.BytesIO()
    np.savez_compressed(stream, **arrays)
    write_whole(Path(path), stream.getvalue())


def _json(text) -> dict[str, str]:
    try:
        found = json.loads(str(text)) if text is not None else {}
    except ValueError:
        return {}
    return {str(k): str(v) for k, v in found.items()} if isinstance(found, dict) else {}
