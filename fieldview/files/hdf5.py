"""HDF5 containers: every numeric dataset, by its path in the file."""

from __future__ import annotations

import io
from collections.abc import Mapping
from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.files.contents import Contents, Variable, unnamed_dims
from fieldview.files.writing import remarks_of, said_by_remarks, values_of, write_whole

SUFFIXES = (".h5", ".hdf5", ".hdf")


def read(path: Path) -> Contents:
    """The datasets of a container, read by frame; the file is opened anew for every part that is read."""
    variables, notes = [], []
    stated = said_by_remarks(_remarks(path))
    for name, shape, unit, samples, plain in _listed(path):
        if not plain:
            notes.append(f'"{name}" holds no numbers and is not read')
            continue
        dims = unnamed_dims(shape)
        role = {"role": name if stated and name == "status" else None}
        variables.append(Variable(name, unit, dims, shape, _fetch(path, name, dims), None, samples, role))
    if not variables:
        raise InputError(f"{path.name}: holds no datasets of numbers; a field needs x, y and a component")
    rows = (("name", "shape"), *((v.name, " x ".join(map(str, v.shape))) for v in variables))
    return Contents(path, "HDF5 container", tuple(variables), tuple(notes), rows, stated)


def arrays_of(path: Path) -> tuple[dict[str, np.ndarray], dict[str, str]]:
    """All numeric datasets at once, and their units."""
    found, units = {}, {}
    for name, _, unit, _, plain in _listed(path):
        if plain:
            found[name] = _fetch(path, name, ())({})
            if unit is not None:
                units[name] = unit
    return found, units


def write_hdf5(
    path: str | Path,
    field: Field,
    *,
    quantities: Mapping[str, tuple[np.ndarray, str]] | None = None,
    attributes: Mapping[str, str] | None = None,
) -> None:
    """Write one field as datasets [y, x], each with its ``units``; the same field gives the same bytes.

    Positions are lists along the axes; where the axes were turned, arrays in plane coordinates. ``remarks``
    of the file says what the status codes mean.
    """
    import h5py

    values = values_of(field, quantities)
    if field.grid.placement.is_identity:
        values |= {name: (getattr(field.grid, name), values[name][1]) for name in ("x", "y")}
    stream = io.BytesIO()
    with h5py.File(stream, "w", track_order=True) as container:
        container.attrs["remarks"] = "\n".join(remarks_of(field, attributes))
        for name, (array, unit) in values.items():
            node = container.create_dataset(name.replace("/", " per "), data=np.asarray(array))
            node.attrs["units"] = unit
    write_whole(Path(path), stream.getvalue())


def _remarks(path: Path) -> list[str]:
    with _opened(path) as container:
        return (_text(container.attrs.get("remarks")) or "").split("\n")


def _listed(path: Path) -> list[tuple]:
    """(name, shape, unit, samples, whether it holds numbers) of every dataset."""
    import h5py

    found = []

    def visit(name: str, node) -> None:
        if isinstance(node, h5py.Dataset) and not name.startswith("#"):
            plain = node.dtype.kind in "fiub" and node.size
            first = (
                np.ravel(node[tuple(slice(0, 1) for _ in node.shape[:-1])])[:3]
                if plain and node.shape
                else ()
            )
            samples = tuple(f"{value:g}" for value in first)
            found.append(
                (name, node.shape, _text(node.attrs.get("units", node.attrs.get("unit"))), samples, plain)
            )

    with _opened(path) as container:
        container.visititems(visit)
    return found


def _fetch(path: Path, name: str, dims: tuple[str, ...]):
    def fetch(fixed) -> np.ndarray:
        with _opened(path) as container:
            node = container[name]
            places = tuple(fixed.get(dim, slice(None)) for dim in dims)
            values = np.asarray(node[places] if dims else node[()], float)
            fill = node.attrs.get("_FillValue")
            if fill is not None:
                values = np.where(np.isin(values, np.ravel(np.asarray(fill, float))), np.nan, values)
            return values

    return fetch


def _opened(path: Path):
    import h5py

    try:
        return h5py.File(path, "r")
    except OSError:
        raise InputError(f"{path.name}: is cut off or damaged HDF5; export it again") from None


def _text(value) -> str | None:
    if value is None:
        return None
    value = value[0] if isinstance(value, np.ndarray) and value.size else value
    return value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value)
