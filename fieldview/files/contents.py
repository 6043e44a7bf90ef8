"""What a file holds before anything is decided about it: named variables, read when they are asked for."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

ROWS = "row"
"""The one dimension of a table: its rows."""


@dataclass(frozen=True, eq=False)
class Variable:
    """One named list or array of numbers of a file.

    Attributes
    ----------
    name : str
    unit : str or None
        As written in the file; None where the file says nothing.
    dims : tuple of str
        Names of its dimensions; a container that names none has ``axis0``, ``axis1`` ... by size.
    shape : tuple of int
    fetch : callable (mapping of dimension to index) -> ndarray
        Reads the part of it that is left when some dimensions are fixed; NaN where it has no value.
    standard_name : str or None
        By the CF conventions.
    samples : tuple of str
        The first values as they are written.
    attributes : mapping
        Whatever else the file says of it.
    """

    name: str
    unit: str | None
    dims: tuple[str, ...]
    shape: tuple[int, ...]
    fetch: Callable[[Mapping[str, int]], np.ndarray]
    standard_name: str | None = None
    samples: tuple[str, ...] = ()
    attributes: Mapping = field(default_factory=dict)


@dataclass(frozen=True, eq=False)
class Contents:
    """An opened file.

    Attributes
    ----------
    path : Path
    format : str
        What kind of file it is, in words.
    variables : tuple of Variable
    notes : tuple of str
        What was dropped or assumed while opening it.
    first_rows : tuple of tuple of str
        The first rows of a table as text, or the variables of a container with their shapes.
    stated : mapping
        What the file says of itself beyond its variables: ``time`` [s] of its one frame, ``placement``.
    """

    path: Path
    format: str
    variables: tuple[Variable, ...]
    notes: tuple[str, ...] = ()
    first_rows: tuple[tuple[str, ...], ...] = ()
    stated: Mapping = field(default_factory=dict)

    def __getitem__(self, name: str) -> Variable:
        return next(variable for variable in self.variables if variable.name == name)


def whole(values: np.ndarray) -> Callable[[Mapping[str, int]], np.ndarray]:
    """How an array already read gives the part of it that is left when some axes are fixed."""

    def fetch(fixed: Mapping[str, int]) -> np.ndarray:
        if not fixed:
            return values
        places = tuple(fixed.get(f"axis{axis}", slice(None)) for axis in range(values.ndim))
        return values[places]

    return fetch


def unnamed_dims(shape: tuple[int, ...]) -> tuple[str, ...]:
    """Names for the dimensions of an array of a container that names none."""
    return tuple(f"axis{axis}" for axis in range(len(shape)))
