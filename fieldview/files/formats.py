"""Which reader a file needs: told by its first bytes, its name only where they leave a choice."""

from __future__ import annotations

from importlib import import_module
from pathlib import Path

from fieldview.compute.errors import InputError
from fieldview.files.contents import Contents

SUFFIXES = (
    ".csv",
    ".txt",
    ".dat",
    ".tsv",
    ".asc",
    ".nc",
    ".nc4",
    ".cdf",
    ".h5",
    ".hdf5",
    ".hdf",
    ".npz",
    ".mat",
)
"""Endings of files that a folder is searched for; each may be followed by .gz."""

_HDF5 = b"\x89HDF\r\n\x1a\n"


def read_contents(path: Path) -> Contents:
    """What a file holds. Each format's module has a function ``read(path) -> Contents``."""
    try:
        with path.open("rb") as stream:
            first = stream.read(520)
    except IsADirectoryError:
        raise InputError(f"{path}: is a folder; name the files in it") from None
    except OSError as error:
        raise InputError(f"{path}: cannot be read ({error.strerror}); check the path") from None
    if not first:
        raise InputError(f"{path.name}: is empty; measure or export it again")
    return import_module(f"fieldview.files.{_format(first, path)}").read(path)


def _format(first: bytes, path: Path) -> str:
    if first.startswith(b"MATLAB ") or _HDF5 in first[512:]:
        return "matlab"
    if first.startswith(_HDF5):
        return "netcdf" if path.suffix.lower() in (".nc", ".nc4", ".cdf") else "hdf5"
    if first.startswith(b"CDF"):
        return "netcdf"
    if first.startswith(b"PK\x03\x04"):
        return "npz"
    return "delimited"
