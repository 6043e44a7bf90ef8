"""MATLAB containers, through scipy; those of version 7.3 are HDF5 inside."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.files.contents import Contents
from fieldview.files.npz import contents_of

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
    arrays = dict(_flat({name: value for name, value in loaded.items() if not name.startswith("__")}))
    units = {str(k): str(v) for k, v in _units(loaded).items()}
    return contents_of(path, "MATLAB container", arrays, units, {})


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
