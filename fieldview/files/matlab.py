"""MATLAB containers, through scipy; those of version 7.3 are HDF5 inside."""

from __future__ import annotations

import io
from collections.abc import Mapping
from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.files.contents import Contents
from fieldview.files.npz import contents_of
from fieldview.files.writing import identifiers, remarks_of, said_by_remarks, values_of, write_whole

SUFFIXES = (".mat",)


def read(path: Path) -> Contents:
    """The numeric arrays of a container, those inside structures under ``structure.name``."""
    import scipy.io

    try:
        loaded = scipy.io.loadmat(path, simplify_cells=True)
    except NotImplementedError:
        from fieldview.files.hdf5 import arrays_of

        # version 7.3 stores its arrays column by column
        arrays, units = arrays_of(path)
        return contents_of(
            path, "MATLAB container 7.3", {n: a.T.squeeze() for n, a in arrays.items()}, units, {}
        )
    except Exception:  # scipy raises errors of many kinds on a damaged file
        raise InputError(f"{path.name}: is cut off or damaged; export it again") from None
    own_names = loaded.pop("names", {})
    stated = said_by_remarks(str(line) for line in np.ravel(loaded.pop("remarks", [])))
    arrays = dict(_flat({name: value for name, value in loaded.items() if not name.startswith("__")}))
    units = {str(k): str(v) for k, v in _units(loaded).items()}
    if stated and isinstance(own_names, dict):
        arrays, units = ({own_names.get(n, n): held for n, held in part.items()} for part in (arrays, units))
    return contents_of(path, "MATLAB container", arrays, units, stated)


def write_matlab(
    path: str | Path,
    field: Field,
    *,
    quantities: Mapping[str, tuple[np.ndarray, str]] | None = None,
    attributes: Mapping[str, str] | None = None,
) -> None:
    """Write one field as arrays [y, x], with structures ``units`` and ``names``; the same bytes every time.

    Names become identifiers; ``names`` holds them as they were. Positions are lists along the axes, where
    the axes were turned arrays in plane coordinates.
    """
    import scipy.io

    values = values_of(field, quantities)
    safe = identifiers(values)
    arrays = {safe[name]: np.asarray(array) for name, (array, _) in values.items()}
    if field.grid.placement.is_identity:
        arrays |= {"x": field.grid.x, "y": field.grid.y}
    arrays["units"] = {safe[name]: unit for name, (_, unit) in values.items()}
    arrays["names"] = {safe[name]: name for name in values}
    arrays["remarks"] = np.array(remarks_of(field, attributes), object)
    stream = io.BytesIO()
    scipy.io.savemat(stream, arrays, do_compression=True, long_field_names=True)
    content = stream.getvalue()
    # the first 116 bytes are free text, in which scipy writes the time of day
    write_whole(Path(path), _HEADER + content[len(_HEADER) :])


_HEADER = b"MATLAB 5.0 MAT-file, written by loopflux".ljust(116)


def _flat(entries: dict, above: str = ""):
    for name, value in entries.items():
        if isinstance(value, dict):
            yield from _flat(value, f"{above}{name}.")
        elif isinstance(value, np.ndarray) and value.dtype.kind in "fiub":
            yield above + name, value
        elif isinstance(value, int | float):
            yield above + name, np.array(value, float)


def _units(loaded: dict) -> dict:
    """A structure ``units`` of names and texts, where there is one."""
    units = loaded.get("units")
    return units if isinstance(units, dict) else {}
