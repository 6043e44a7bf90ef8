"""NetCDF, version 4 and classic, by the CF conventions where the file follows them."""

from __future__ import annotations

import re
import tempfile
import threading
from collections.abc import Mapping
from pathlib import Path

import numpy as np

import fieldview
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.quantities import QUANTITIES
from fieldview.files.contents import Contents, Variable
from fieldview.files.writing import (
    STATUS_MEANINGS,
    identifiers,
    remarks_of,
    said_by_remarks,
    values_of,
    write_whole,
)

SUFFIXES = (".nc", ".nc4", ".cdf")

_OWN_NAME = "name_in_session"
"""Attribute with a variable's name where that is no identifier."""

LONG_NAMES = {
    "x": "position along x",
    "y": "position along y",
    "u": "velocity along x",
    "v": "velocity along y",
    "w": "velocity out of the plane",
}


def read(path: Path) -> Contents:
    """The variables of a file, read by frame; scale factors and fill values applied, times as numbers."""
    dataset = _opened(path)
    lock = threading.Lock()
    variables, notes = [], []
    ours = _is_ours(dataset)
    for key, variable in dataset.variables.items():
        key = str(key)
        name = str(variable.attrs.get(_OWN_NAME, key)) if ours else key
        if variable.dtype.kind not in "fiub" or variable.size == 0:
            if variable.shape and "char" not in str(variable.dims):
                notes.append(f'"{name}" holds no numbers and is not read')
            continue
        attributes = {word: value for word, value in variable.attrs.items() if isinstance(value, str)}
        meanings = "flag_meanings" in variable.attrs and name == "status"
        attributes["role"] = "status" if meanings and ours else None
        variables.append(
            Variable(
                name,
                variable.attrs.get("units"),
                tuple(map(str, variable.dims)),
                variable.shape,
                _fetch(dataset, key, lock),
                variable.attrs.get("standard_name"),
                _samples(variable),
                attributes,
            )
        )
    if not variables:
        raise InputError(f"{path.name}: holds no variables of numbers; a field needs x, y and a component")
    remarks = str(dataset.attrs.get("remarks", "")).split("\n")
    rows = [("name", "dimensions", "unit")]
    rows += [
        (v.name, ", ".join(f"{d} {n}" for d, n in zip(v.dims, v.shape, strict=True)), v.unit or "")
        for v in variables
    ]
    return Contents(path, "NetCDF", tuple(variables), tuple(notes), tuple(rows), said_by_remarks(remarks))


def write_netcdf(
    path: str | Path,
    field: Field,
    *,
    quantities: Mapping[str, tuple[np.ndarray, str]] | None = None,
    attributes: Mapping[str, str] | None = None,
) -> None:
    """Write one field by the CF conventions 1.11, readable by any NetCDF-4 reader.

    ``status`` has flag_values and flag_meanings and is, with the uncertainties, an ancillary variable of the
    components. The same field gives the same bytes.
    """
    import xarray

    values = values_of(field, quantities)
    safe = identifiers(values)
    turned = not field.grid.placement.is_identity
    dims = ("row", "column") if turned else ("y", "x")
    coordinates = {
        "x": (dims, values["x"][0]) if turned else ("x", field.grid.x),
        "y": (dims, values["y"][0]) if turned else ("y", field.grid.y),
    }
    if field.time is not None:
        coordinates["time"] = ((), field.time)
    arrays = {
        safe[name]: (dims, np.asarray(array)) for name, (array, _) in values.items() if name not in ("x", "y")
    }
    dataset = xarray.Dataset(arrays, coordinates)
    for name, (_, unit) in values.items():
        dataset[safe[name]].attrs.update(units=_spelled(unit), long_name=_long_name(name))
        if safe[name] != name:
            dataset[safe[name]].attrs[_OWN_NAME] = name
    if "time" in dataset:
        dataset["time"].attrs.update(units="s", long_name="time of the frame in its run")
    codes = np.array([int(code) for code in Status], np.uint8)
    dataset["status"].attrs.update(
        long_name="what became of the vector", flag_values=codes, flag_meanings=" ".join(STATUS_MEANINGS)
    )
    for name in field.components:
        ancillary = [other for other in ("status", f"sigma_{name}") if other in dataset]
        dataset[name].attrs["ancillary_variables"] = " ".join(ancillary)
    dataset.attrs = {
        "Conventions": "CF-1.11",
        "history": f"read and cleaned by loopflux {fieldview.__version__}; the remarks name the session",
        "remarks": "\n".join(remarks_of(field, None)),
        **{key: str(value) for key, value in (attributes or {}).items()},
    }
    fill = {name: {"_FillValue": np.nan if dataset[name].dtype.kind == "f" else None} for name in arrays}
    fill |= {name: {"_FillValue": None} for name in coordinates}
    path = Path(path)
    write_whole(path, _bytes_of(dataset, fill))


def _long_name(name: str) -> str:
    if name in LONG_NAMES:
        return LONG_NAMES[name]
    of = name.removeprefix("sigma_") if name.startswith("sigma_") else name.removesuffix("_uncertainty")
    shown = QUANTITIES[of].title.lower() if of in QUANTITIES else of
    return shown if of == name else f"standard uncertainty of {LONG_NAMES.get(of, shown)}"


def _bytes_of(dataset, encoding) -> bytes:
    """The file's content; written to a scratch file first, since HDF5 wants one."""
    with tempfile.TemporaryDirectory() as scratch:
        whole = Path(scratch) / "field.nc"
        dataset.to_netcdf(whole, engine="h5netcdf", encoding=encoding)
        return whole.read_bytes()


def _opened(path: Path):
    import xarray

    with path.open("rb") as stream:
        classic = stream.read(3) == b"CDF"
    try:
        return xarray.open_dataset(path, engine="scipy" if classic else "h5netcdf", decode_times=False)
    except Exception:  # the engines raise errors of many kinds on a damaged file
        raise InputError(f"{path.name}: is cut off or damaged NetCDF; export it again") from None


def _is_ours(dataset) -> bool:
    return bool(said_by_remarks(str(dataset.attrs.get("remarks", "")).split("\n")))


def _fetch(dataset, name: str, lock: threading.Lock):
    def fetch(fixed) -> np.ndarray:
        with lock:
            return np.asarray(dataset.variables[name].isel(dict(fixed)).values, float)

    return fetch


def _samples(variable) -> tuple[str, ...]:
    first = variable.isel(
        {dim: slice(0, 3) if i == variable.ndim - 1 else 0 for i, dim in enumerate(variable.dims)}
    )
    return tuple(f"{float(value):g}" for value in np.ravel(first.values))


def _spelled(unit: str) -> str:
    """A unit as CF writes it: ``m^2/s`` is ``m2 s-1``."""
    above, *below = unit.replace("^", "").split("/")
    words = [] if above in ("", "1") else [above]
    words += [re.sub(r"^(\D+)(\d*)$", lambda m: f"{m[1]}-{m[2] or 1}", part) for part in below]
    return " ".join(words) or "1"
