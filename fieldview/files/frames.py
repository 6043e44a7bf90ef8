"""From what a file holds to fields: roles, units, senses, the lattice."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid, Placement
from fieldview.compute.units import Units
from fieldview.files.arrangement import Arrays, Rows, arrange
from fieldview.files.contents import Contents
from fieldview.files.gridding import Lattice, lattice_of
from fieldview.files.midpoint import to_midpoint
from fieldview.files.reading import Reading
from fieldview.files.roles import NeedsAnswer, Question, find_roles
from fieldview.files.scales import Scales, find_scales

COMPONENTS = ("u", "v", "w")


@dataclass(frozen=True, eq=False)
class Layout:
    """How one file, and every file like it, becomes fields.

    Attributes
    ----------
    contents : Contents
        The file itself.
    roles : mapping of role to variable name
    scales : Scales
        Factors to the program's units.
    source : Rows or Arrays
    reading : Reading
    channels : tuple of str
        Variables kept under their own names.
    notes : tuple of str
    """

    contents: Contents
    roles: Mapping[str, str]
    scales: Scales
    source: Rows | Arrays
    reading: Reading
    channels: tuple[str, ...]
    notes: tuple[str, ...] = field(default=())

    @property
    def frames(self) -> int:
        return self.source.frames

    def times(self) -> list[float | None]:
        """Time of each frame as far as the file says it. [s]"""
        stated = self.contents.stated.get("time")
        if stated is not None and self.frames == 1:
            return [stated]
        return [None if t is None else t * self.scales.time for t in self.source.times()]


def lay_out(contents: Contents, reading: Reading) -> Layout:
    """Decide how a file is read.

    Raises NeedsAnswer with every question where the file does not say what must be known, InputError where
    it cannot be read at all.
    """
    roles, questions = find_roles(contents, reading)
    if questions:
        raise NeedsAnswer(contents.path.name, questions + _sense_questions(roles, contents, reading))
    scales, more = find_scales(contents, roles, reading)
    questions = more + _sense_questions(roles, contents, reading)
    if questions:
        raise NeedsAnswer(contents.path.name, questions)
    source = arrange(contents, roles, reading)
    taken = set(roles.values())
    ignored = {entry for entry in reading.ignore if isinstance(entry, str)}
    ignored |= {contents.variables[entry].name for entry in reading.ignore if isinstance(entry, int)}
    channels = tuple(
        variable.name
        for variable in contents.variables
        if variable.name not in taken | ignored and source.belongs(variable)
    )
    notes = (*contents.notes, *source.notes, *scales.notes, *_assumed(roles, reading, contents))
    return Layout(contents, roles, scales, source, reading, channels, notes)


def frame_of(layout: Layout, frame: int, known: Grid | None = None) -> tuple[Field, tuple[str, ...]]:
    """One frame of a file as a field in the program's units, its lattice to the right and up.

    With it what was dropped while its rows were put on the lattice, in words.

    ``known`` is the grid of the run; a frame with the same lines, or some of them, is placed on it.
    """
    contents, source, reading = layout.contents, layout.source, layout.reading
    name = contents.path.name
    lattice, spread, placement = _lattice(layout, frame, name)
    scales = layout.scales
    parts = _components(layout, frame, spread)
    if reading.v_positive == "down" and "v" in parts and "v" in layout.roles:
        parts["v"] = -parts["v"]
    channels = {
        channel: spread(_without_sentinels(source.values(channel, frame), reading))
        for channel in layout.channels
    }
    sigma = {
        component: np.abs(spread(_read(layout, f"sigma_{component}", frame))) * scales.sigma[component]
        for component in COMPONENTS
        if f"sigma_{component}" in layout.roles and component in parts
    }
    status = spread(_read(layout, "status", frame)) if "status" in layout.roles else None
    x, y = lattice.x * scales.x, lattice.y * scales.y
    if reading.y_axis == "down":
        flip = lambda array: array[::-1]  # noqa: E731
        y = -y[::-1]
        parts, channels, sigma = ({k: flip(a) for k, a in d.items()} for d in (parts, channels, sigma))
        status = None if status is None else flip(status)
    grid = Grid(x, y, placement)
    if known is not None and not grid.same_nodes(known):
        onto = _onto(grid, known, name)
        parts, channels, sigma = ({k: onto(a) for k, a in d.items()} for d in (parts, channels, sigma))
        status = None if status is None else onto(status)
        grid = known
    if all(not np.isfinite(part).any() for part in parts.values()):
        raise InputError(f"{name}: every vector is missing; check the missing values and the columns")
    codes = _codes(parts, status, name)
    notes = [*layout.notes, *lattice.notes]
    made = Field(
        grid,
        **parts,
        status=codes,
        units=scales.units,
        time=layout.times()[frame],
        channels=channels,
        channel_units={c: contents[c].unit or "" for c in layout.channels},
        error=_error(sigma, codes, notes),
        notes=(),
    )
    if reading.vector_position == "first_image":
        made = to_midpoint(made, pulse_separation=reading.pulse_separation)
    return made, lattice.notes


def _lattice(layout: Layout, frame: int, name: str):
    """The lattice of a frame in the file's units, how values are spread on it, and its placement."""
    source = layout.source
    x, y = source.axes(frame)
    placement = layout.contents.stated.get("placement", Placement())
    try:
        if not placement.is_identity:
            z = placement.to_lattice(x + 1j * y)
            x, y = z.real, z.imag
        if isinstance(source, Rows):
            lattice = lattice_of(x, y)
            return lattice, lattice.spread, placement
        if x.ndim == 2:
            lattice = lattice_of(np.ravel(x), np.ravel(y))
            return lattice, lambda values: lattice.spread(np.ravel(values)), placement
        lattice = _of_axes(x, y)
    except InputError as error:
        raise InputError(f"{name}: {error}") from None
    return lattice, lattice.spread, placement


def _of_axes(x: np.ndarray, y: np.ndarray) -> Lattice:
    for letter, axis in (("x", x), ("y", y)):
        steps = np.diff(axis)
        if not np.isfinite(axis).all() or not ((steps > 0).all() or (steps < 0).all()):
            raise InputError(f"the {letter} axis neither rises nor falls all along; correct it in the file")
    flip = tuple(bool(axis.size > 1 and axis[1] < axis[0]) for axis in (x, y))
    ordered = [axis[::-1] if down else axis for axis, down in zip((x, y), flip, strict=True)]
    return Lattice(*ordered, None, slice(None), False, flip)


def _read(layout: Layout, role: str, frame: int) -> np.ndarray:
    return _without_sentinels(layout.source.values(layout.roles[role], frame), layout.reading)


def _without_sentinels(values: np.ndarray, reading: Reading) -> np.ndarray:
    if not reading.missing:
        return values
    return np.where(np.isin(values, reading.missing), np.nan, values)


def _components(layout: Layout, frame: int, spread) -> dict[str, np.ndarray]:
    """Components on the lattice in the program's units, as the file counts them."""
    scales, reading = layout.scales, layout.reading
    parts = {
        name: spread(_read(layout, name, frame)) * scales.flow[name]
        for name in COMPONENTS
        if name in layout.roles
    }
    if "speed" in layout.roles:
        speed = spread(_read(layout, "speed", frame)) * scales.flow["speed"]
        angle = (
            spread(_read(layout, "direction", frame)) * scales.angle if "direction" in layout.roles else None
        )
        if angle is None:
            return parts
        if reading.direction_zero == "north":
            angle = np.pi / 2 - angle
        if _sense(layout.contents, layout.roles, reading) == "from":
            angle = angle + np.pi
        parts |= {"u": speed * np.cos(angle), "v": speed * np.sin(angle)}
    return parts


def _sense(contents: Contents, roles: Mapping[str, str], reading: Reading) -> str | None:
    """Whether a direction is where the flow goes to or comes from; some CF names say so."""
    standard = contents[roles["direction"]].standard_name or ""
    said = {"wind_from_direction": "from", "wind_to_direction": "towards"}.get(standard)
    return reading.direction_sense or said


def _sense_questions(roles, contents: Contents, reading: Reading) -> list[Question]:
    questions = []
    if "direction" in roles and {"u", "v"}.isdisjoint(roles):
        standard = contents[roles["direction"]].standard_name or ""
        if reading.direction_zero is None and "direction" not in standard:
            questions.append(
                Question(
                    "direction_zero",
                    "say under direction_zero whether the direction counts from north (clockwise) or from x "
                    "(counter-clockwise)",
                )
            )
        if _sense(contents, roles, reading) is None:
            questions.append(
                Question(
                    "direction_sense",
                    "say under direction_sense whether the direction is where the flow goes (towards) or "
                    "comes from (from)",
                )
            )
    return questions


def _assumed(roles, reading: Reading, contents: Contents) -> list[str]:
    notes = []
    if contents.stated.get("own"):
        return notes
    if reading.y_axis is None:
        notes.append("y is taken to grow upward; say y_axis if it does not")
    if reading.v_positive is None and "v" in roles:
        notes.append("v is taken to be positive upward; say v_positive if it is not")
    return notes


def _codes(parts, status, name: str) -> np.ndarray:
    absent = np.zeros(next(iter(parts.values())).shape, bool)
    for part in parts.values():
        absent |= ~np.isfinite(part)
    if status is None:
        return np.where(absent, Status.MISSING, Status.MEASURED).astype(np.uint8)
    codes = np.where(np.isnan(status), Status.MISSING, status).astype(int)
    if not np.isin(codes, [int(code) for code in Status]).all():
        raise InputError(f"{name}: the status column has codes other than 0 to 4; list it under ignore")
    has_value = (codes == Status.MEASURED) | (codes == Status.FILLED)
    return np.where(has_value & absent, Status.MISSING, codes).astype(np.uint8)


def _error(sigma: dict[str, np.ndarray], codes: np.ndarray, notes: list[str]) -> ErrorModel:
    if not sigma:
        return ErrorModel()
    has_value = (codes == Status.MEASURED) | (codes == Status.FILLED)
    whole = {}
    for component, spread in sigma.items():
        lacking = has_value & ~np.isfinite(spread)
        usual = float(np.nanmedian(spread[has_value])) if np.isfinite(spread[has_value]).any() else np.nan
        # a node without a vector never counts; a vector without its own takes the usual one
        whole[component] = np.where(np.isfinite(spread), spread, np.where(lacking, usual, 0.0))
    return ErrorModel(sigma=whole, origin="from file")


def _onto(grid: Grid, known: Grid, name: str):
    """How arrays on a frame's own lattice are placed on the run's."""
    places = []
    for letter, own, run in (("x", grid.x, known.x), ("y", grid.y, known.y)):
        near = (
            np.clip(np.searchsorted(run, own), 1, max(run.size - 1, 1))
            if run.size > 1
            else np.zeros(own.size, int)
        )
        if run.size > 1:
            near = near - (own - run[near - 1] < run[near] - own)
        tolerance = 1e-3 * np.min(np.diff(run)) if run.size > 1 else 1e-9 * max(1.0, abs(run[0]))
        if (np.abs(run[near] - own) > tolerance).any():
            raise InputError(
                f"{name}: its {letter} positions are not those of the run's first frame; "
                "keep only files of one grid in a run"
            )
        places.append(near)
    ix, iy = places
    if ix.size == known.x.size and iy.size == known.y.size:
        return lambda values: values

    def onto(values: np.ndarray) -> np.ndarray:
        whole = np.full(known.shape, np.nan)
        whole[np.ix_(iy, ix)] = values
        return whole

    return onto


__all__ = ["Layout", "Units", "frame_of", "lay_out"]
