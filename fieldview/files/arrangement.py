"""How the variables of a file make frames on a lattice: rows of a table, or arrays of a container."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.files.contents import Contents, Variable
from fieldview.files.reading import Reading
from fieldview.files.roles import NeedsAnswer, Question

TIME_NAMES = ("time", "t", "frame", "frames", "snapshot", "sample")


@dataclass(frozen=True, eq=False)
class Rows:
    """Variables that are lists of one length; several frames are told apart by a time or frame column."""

    contents: Contents
    roles: dict[str, str]
    notes: tuple[str, ...] = ()

    @cached_property
    def _frame_values(self) -> tuple[np.ndarray, np.ndarray] | None:
        """Distinct values of the frame or time column in order, and where each frame's rows are."""
        name = self.roles.get("frame") or self.roles.get("time")
        if name is None:
            return None
        values = self.contents[name].fetch({})
        if np.isnan(values).any():
            raise InputError(
                f'{self.contents.path.name}: the column "{name}" tells the frames apart but has missing '
                "values; correct the file or list the column under ignore"
            )
        distinct, inverse = np.unique(values, return_inverse=True)
        return distinct, inverse

    @cached_property
    def _rows_of(self) -> list[np.ndarray] | None:
        if self._frame_values is None or self._frame_values[0].size == 1:
            return None
        distinct, inverse = self._frame_values
        order = np.argsort(inverse, kind="stable")
        return np.split(order, np.cumsum(np.bincount(inverse, minlength=distinct.size))[:-1])

    @property
    def frames(self) -> int:
        return 1 if self._rows_of is None else len(self._rows_of)

    def times(self) -> list[float | None]:
        """Values of the time column by frame."""
        name = self.roles.get("time")
        if name is None:
            return [None] * self.frames
        values = self.contents[name].fetch({})
        if self._rows_of is None:
            return [float(values[0])]
        return [float(values[rows[0]]) for rows in self._rows_of]

    def axes(self, frame: int) -> tuple[np.ndarray, np.ndarray]:
        return self.values(self.roles["x"], frame), self.values(self.roles["y"], frame)

    def values(self, name: str, frame: int) -> np.ndarray:
        values = self.contents[name].fetch({})
        return values if self._rows_of is None else values[self._rows_of[frame]]

    def belongs(self, variable: Variable) -> bool:
        """Whether a variable has a value at every node."""
        return not variable.attributes.get("text") and variable.shape == self.contents[self.roles["x"]].shape


@dataclass(frozen=True, eq=False)
class Arrays:
    """Variables that are arrays over the lattice, possibly with a dimension of frames."""

    contents: Contents
    roles: dict[str, str]
    row_dim: str
    column_dim: str
    frame_dim: str | None
    frames: int
    fixed: dict[str, int]
    dims_of: dict[str, tuple[str, ...]] = field(default_factory=dict)
    notes: tuple[str, ...] = ()

    def times(self) -> list[float | None]:
        name = self.roles.get("time")
        variable = self.contents[name] if name is not None else None
        if variable is not None and variable.shape in ((), (1,)) and self.frames == 1:
            return [float(np.ravel(variable.fetch({}))[0])]
        if variable is None or variable.shape != (self.frames,):
            return [None] * self.frames
        values = variable.fetch({})
        return [float(value) if np.isfinite(value) else None for value in values]

    def axes(self, frame: int) -> tuple[np.ndarray, np.ndarray]:
        return tuple(self._fetched(self.roles[name], frame) for name in ("x", "y"))

    def values(self, name: str, frame: int) -> np.ndarray:
        """ndarray (rows, columns) as they stand in the file."""
        dims = self.dims_of[name]
        left = [dim for dim in dims if dim not in self.fixed and dim != self.frame_dim]
        values = self._fetched(name, frame)
        return values if left == [self.row_dim, self.column_dim] else values.T

    def _fetched(self, name: str, frame: int) -> np.ndarray:
        variable = self.contents[name]
        dims = self.dims_of.get(name, variable.dims)
        fixed = {dim: index for dim, index in self.fixed.items() if dim in dims}
        if self.frame_dim in dims:
            fixed[self.frame_dim] = frame
        # a container that names no dimensions knows them by their place
        return np.asarray(
            variable.fetch({variable.dims[dims.index(dim)]: i for dim, i in fixed.items()}), float
        )

    def belongs(self, variable: Variable) -> bool:
        dims = self.dims_of.get(variable.name)
        return dims is not None and {self.row_dim, self.column_dim} <= set(dims)


def arrange(contents: Contents, roles: dict[str, str], reading: Reading) -> Rows | Arrays:
    """How the file's variables make frames.

    Raises NeedsAnswer where an entry of a further dimension must be chosen, InputError where the shapes of
    positions and components do not fit.
    """
    x, y = contents[roles["x"]], contents[roles["y"]]
    flow = [contents[roles[name]] for name in ("u", "v", "w", "speed", "direction") if name in roles]
    lists = all(len(variable.dims) == 1 and variable.shape == x.shape for variable in (x, y, *flow))
    if lists and (x.dims == y.dims or _is_unnamed(x)):
        return Rows(contents, roles)
    return _arrays(contents, roles, reading, x, y, flow)


def _arrays(contents, roles, reading, x, y, flow) -> Arrays:
    notes: list[str] = []
    dims_of = {}
    named = not _is_unnamed(x)
    for variable in contents.variables:
        if variable.name in (x.name, y.name):
            dims_of[variable.name] = _axis_dims(variable, "x" if variable is x else "y", named)
            continue
        dims = variable.dims if named else _dims_by_size(variable, x, y, notes if variable in flow else [])
        if dims is not None:
            dims_of[variable.name] = dims
    row_dim, column_dim = _lattice_dims(x, y, dims_of)
    name = contents.path.name
    for variable in flow:
        if not {row_dim, column_dim} <= set(dims_of.get(variable.name, ())):
            raise InputError(
                f'{name}: "{variable.name}" has the shape {_by(variable.shape)}, which does not fit '
                f"{_by(y.shape)} rows and {_by(x.shape)} columns; check which variable is x and which is y"
            )
    extra: dict[str, int] = {}
    for variable in flow:
        for dim, size in zip(dims_of[variable.name], variable.shape, strict=True):
            if dim not in (row_dim, column_dim):
                extra[dim] = size
    fixed = {}
    for dim, entry in reading.select.items():
        if dim not in extra:
            known = ", ".join(f'"{d}"' for d in extra) or "none"
            raise InputError(f'{name}: select names "{dim}", but the further dimensions are: {known}')
        fixed[dim] = _entry(contents, dim, entry, extra[dim])
    for dim, size in extra.items():
        if size == 1 and dim not in fixed:
            fixed[dim] = 0
    open_dims = [dim for dim in extra if dim not in fixed]
    time_dims = [contents[roles["time"]].dims] if "time" in roles else []
    frame_dims = [d for d in open_dims if (d,) in time_dims or d.lower() in TIME_NAMES]
    if len(frame_dims) == 1:
        frame_dim = frame_dims[0]
    else:
        # where dimensions have names, one that is not time must be chosen from, never taken for frames
        frame_dim = open_dims[0] if len(open_dims) == 1 and not named else None
    rest = [dim for dim in open_dims if dim != frame_dim]
    if rest:
        sizes = ", ".join(f'"{dim}" (0 to {extra[dim] - 1})' for dim in rest)
        raise NeedsAnswer(name, [Question("select", f"choose an entry of {sizes} under select")])
    return Arrays(
        contents,
        roles,
        row_dim,
        column_dim,
        frame_dim,
        extra[frame_dim] if frame_dim is not None else 1,
        fixed,
        dims_of,
        tuple(notes),
    )


def _is_unnamed(variable: Variable) -> bool:
    """Whether the container names no dimensions."""
    return variable.dims[:1] == ("axis0",)


def _axis_dims(variable: Variable, axis: str, named: bool) -> tuple[str, ...]:
    if named:
        return variable.dims
    return (axis,) if len(variable.shape) == 1 else ("y", "x")


def _lattice_dims(x: Variable, y: Variable, dims_of) -> tuple[str, str]:
    if len(x.shape) == 2 and x.shape == y.shape:
        return dims_of[x.name]
    if len(x.shape) == 1 and len(y.shape) == 1:
        return dims_of[y.name][0], dims_of[x.name][0]
    raise InputError(
        f'"{x.name}" has the shape {_by(x.shape)} and "{y.name}" {_by(y.shape)}; '
        "positions must be two lists or two arrays of one shape"
    )


def _dims_by_size(variable: Variable, x: Variable, y: Variable, notes: list[str]) -> tuple[str, ...] | None:
    """Dimensions of an array in a container that names none, told by their sizes: [y, x] where they agree."""
    shape = variable.shape
    if len(shape) < 2:
        return None
    lattice = x.shape if len(x.shape) == 2 else (y.shape[0], x.shape[0])
    others = [f"axis{axis}" for axis in range(len(shape))]
    if shape[-2:] == lattice:
        return (*others[:-2], "y", "x")
    if shape[:2] == lattice:
        return ("y", "x", *others[2:])
    if len(x.shape) == 1 and shape[-2:] == lattice[::-1]:
        notes.append(f'"{variable.name}" is stored as [x, y] and was turned to [y, x]')
        return (*others[:-2], "x", "y")
    if len(x.shape) == 1 and shape[:2] == lattice[::-1]:
        notes.append(f'"{variable.name}" is stored as [x, y] and was turned to [y, x]')
        return ("x", "y", *others[2:])
    return None


def _entry(contents: Contents, dim: str, entry: int | float | str, size: int) -> int:
    """Index of a chosen entry: a whole number counts from 0, another number is a value of the coordinate."""
    if isinstance(entry, str):
        raise InputError(
            f'{contents.path.name}: select "{dim}" is "{entry}"; give its number, counted from 0'
        )
    if isinstance(entry, int):
        if not 0 <= entry < size:
            raise InputError(f'{contents.path.name}: select "{dim}" is {entry}; it must be 0 to {size - 1}')
        return entry
    coordinate = next((v for v in contents.variables if v.name == dim and v.shape == (size,)), None)
    if coordinate is None:
        raise InputError(f'{contents.path.name}: "{dim}" has no values; give its number, counted from 0')
    values = coordinate.fetch({})
    nearest = int(np.nanargmin(np.abs(values - entry)))
    if abs(values[nearest] - entry) > 1e-6 * max(1.0, abs(entry)):
        raise InputError(
            f'{contents.path.name}: "{dim}" has no value {entry:g}; the nearest is {values[nearest]:g}'
        )
    return nearest


def _by(shape: tuple[int, ...]) -> str:
    return " x ".join(str(size) for size in shape) or "a single number"
