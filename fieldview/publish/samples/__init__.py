"""Sample runs with their sessions, made by seeded generators: every scenario and every number is invented."""

from __future__ import annotations

from collections.abc import Callable
from importlib import import_module
from pathlib import Path

from fieldview.compute.errors import InputError

SAMPLES = ("fin_wake", "stirred_tank", "hood_face")


def write_sample(name: str, folder: Path) -> Path:
    """Write one sample into ``folder``/NAME; returns its session file.

    Raises InputError where the place is taken or cannot be written to.
    """
    place = folder / name
    if place.exists():
        raise InputError(f"{place}: exists already; choose another folder or remove it")
    make: Callable[[Path], Path] = import_module(f"{__name__}.{name}").write
    try:
        place.mkdir(parents=True)
        return make(place)
    except OSError as error:
        raise InputError(f"{place}: cannot be written to ({error.strerror}); choose another folder") from None
