"""The files of a run from names, patterns and folders, in natural order."""

from __future__ import annotations

import re
from collections.abc import Iterable
from pathlib import Path

from fieldview.compute.errors import InputError
from fieldview.files.formats import SUFFIXES


def expand(patterns: Iterable[str | Path], folder: Path | str = ".") -> list[Path]:
    """The files meant by names, patterns like ``run/*.csv`` and folders, relative to ``folder``.

    A pattern's files come in natural order (f2 before f10), the patterns as they are given; a folder
    stands for the data files in it.

    Raises InputError for a name that is not there and a pattern that nothing fits.
    """
    folder = Path(folder)
    found: dict[Path, None] = {}
    for pattern in patterns:
        for path in _matching(str(pattern), folder):
            found.setdefault(path)
    if not found:
        raise InputError("no files are named; give at least one file or pattern")
    return list(found)


def natural_key(path: Path) -> tuple:
    """Sorts numbers within names by value."""
    return tuple(
        (int(part), "") if part.isdigit() else (-1, part.lower())
        for part in re.split(r"(\d+)", path.as_posix())
    )


def _matching(pattern: str, folder: Path) -> list[Path]:
    path = folder / pattern
    if path.is_dir():
        inside = [p for p in path.iterdir() if p.is_file() and is_data_file(p)]
        if not inside:
            raise InputError(f"{path}: holds no data files; known endings are {', '.join(SUFFIXES)}")
        return sorted(inside, key=natural_key)
    if path.exists():
        return [path]
    if not any(sign in pattern for sign in "*?["):
        raise InputError(f"{path}: does not exist; check the path")
    start = Path(path.anchor) if Path(pattern).is_absolute() else folder
    relative = str(path.relative_to(start)) if start != folder else pattern
    fitting = [p for p in start.glob(relative) if p.is_file() and not p.name.startswith(".")]
    if not fitting:
        raise InputError(f'nothing fits "{pattern}" in {folder.resolve().name or folder}; check the pattern')
    return sorted(fitting, key=natural_key)


def is_data_file(path: Path) -> bool:
    """Whether the ending is that of a file of measured vectors."""
    name = path.name.lower().removesuffix(".gz")
    return not name.startswith(".") and name.endswith(SUFFIXES)
