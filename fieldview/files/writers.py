"""The formats that fields are written in, by the ending of the file."""

from __future__ import annotations

from collections.abc import Callable
from importlib import import_module

_WRITERS = {
    "csv": ("delimited", "write_csv"),
    "nc": ("netcdf", "write_netcdf"),
    "npz": ("npz", "write_npz"),
    "h5": ("hdf5", "write_hdf5"),
    "mat": ("matlab", "write_matlab"),
    "vti": ("vtk", "write_image"),
    "vtr": ("vtk", "write_rectilinear"),
}
"""Module of fieldview.files and its function: (path, field, *, quantities, attributes)."""

ENDINGS = tuple(_WRITERS)


def writer(ending: str) -> Callable:
    """The function that writes a field whole or not at all, see `fieldview.files.delimited.write_csv`."""
    module, function = _WRITERS[ending]
    return getattr(import_module(f"fieldview.files.{module}"), function)
