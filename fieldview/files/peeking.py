"""How a file would be read, in words, before it is."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.files.contents import Contents
from fieldview.files.formats import read_contents
from fieldview.files.frames import Layout, frame_of, lay_out
from fieldview.files.reading import Reading
from fieldview.files.roles import NeedsAnswer, Question, find_roles

SENTINELS = (99.0, 999.0, 9999.0, 99999.0, 999999.0)
"""Numbers that often stand for a missing value (common practice, no source)."""


@dataclass(frozen=True)
class PeekedColumn:
    """One column or variable; ``role`` is channel, ignored, words or not used where it has none."""

    name: str
    unit: str | None
    role: str
    samples: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class Peek:
    """How a file would be read.

    Attributes
    ----------
    path : Path
    format : str
    columns : tuple of PeekedColumn
    questions : tuple of Question
        What must be answered before the file can be read.
    units, senses, grid, gaps : str
        In words; empty while there are questions.
    frames : int
    doubts : tuple of str
        What was assumed, dropped or looks odd.
    strongest_vorticity : float or None
        Vorticity of largest size in the first frame, in the file's units of time. [1/time]
    first_rows : tuple of tuple of str
    """

    path: Path
    format: str
    columns: tuple[PeekedColumn, ...]
    questions: tuple[Question, ...] = ()
    units: str = ""
    senses: str = ""
    grid: str = ""
    gaps: str = ""
    frames: int = 0
    doubts: tuple[str, ...] = ()
    strongest_vorticity: float | None = None
    vorticity_unit: str = ""
    first_rows: tuple[tuple[str, ...], ...] = ()

    @property
    def sentences(self) -> tuple[str, ...]:
        """Everything found, and every doubt, in plain sentences."""
        found = [self.format, self.grid, self.gaps, self.units, self.senses]
        if self.frames > 1:
            found.insert(1, f"{self.frames} frames in this file")
        if self.strongest_vorticity is not None:
            turn = "counter-clockwise" if self.strongest_vorticity > 0 else "clockwise"
            found.append(
                f"the strongest vorticity of the first frame is {self.strongest_vorticity:+.3g} "
                f"{self.vorticity_unit}, {turn}; "
                "if it should turn the other way, y_axis or v_positive is wrong"
            )
        return tuple(sentence for sentence in (*found, *self.doubts) if sentence)

    def text(self) -> str:
        """For the terminal."""
        lines = [str(self.path), ""]
        rows = self._rows()
        widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
        for row in rows:
            lines.append("  " + "  ".join(map(str.ljust, row, widths)).rstrip())
        lines += ["", *(f"- {sentence}" for sentence in self.sentences)]
        if self.questions:
            lines += ["", "To be answered under run.reading of the session:"]
            lines += [f"- {question.sentence}" for question in self.questions]
        return "\n".join(lines) + "\n"

    def _rows(self) -> list[tuple[str, ...]]:
        head = [("column", "unit", "read as", "first values")]
        return head + [(c.name, c.unit or "-", c.role, ", ".join(c.samples)) for c in self.columns]


def peek(path: str | Path, reading: Reading | None = None) -> Peek:
    """How a file would be read. Raises InputError where it cannot be read at all."""
    path, reading = Path(path), reading or Reading()
    contents = read_contents(path)
    try:
        layout = lay_out(contents, reading)
    except NeedsAnswer as asked:
        roles, _ = find_roles(contents, reading)
        return Peek(
            path,
            contents.format,
            _columns(contents, roles, (), reading),
            asked.questions,
            doubts=contents.notes,
            first_rows=contents.first_rows,
        )
    first, dropped = frame_of(layout, 0)
    notes = (*layout.notes, *dropped)
    strongest = _strongest_vorticity(first)
    return Peek(
        path,
        contents.format,
        _columns(contents, layout.roles, layout.channels, reading),
        (),
        _units(layout),
        _senses(layout, reading),
        _grid(first),
        _gaps(first),
        layout.frames,
        (*notes, *_odd_values(layout)),
        strongest,
        first.units.of(0, -1),
        contents.first_rows,
    )


def _columns(contents: Contents, roles, channels, reading: Reading) -> tuple[PeekedColumn, ...]:
    role_of = {name: role for role, name in roles.items()}
    ignored = {
        entry if isinstance(entry, str) else contents.variables[entry].name for entry in reading.ignore
    }

    def role(variable) -> str:
        if variable.name in role_of:
            return role_of[variable.name]
        if variable.name in ignored:
            return "ignored"
        if variable.attributes.get("text"):
            return "words"
        return "channel" if variable.name in channels or not channels else "not used"

    return tuple(PeekedColumn(v.name, v.unit, role(v), v.samples) for v in contents.variables)


def _units(layout: Layout) -> str:
    said = ", ".join(f"{role} in {text}" for role, text in layout.scales.written.items())
    return f"{said}; inside the program {layout.scales.units}"


def _senses(layout: Layout, reading: Reading) -> str:
    if "v" not in layout.roles:
        return f"y grows {reading.y_axis or 'upward (assumed)'}"
    return f"y grows {reading.y_axis or 'up (assumed)'}, v is positive {reading.v_positive or 'up (assumed)'}"


def _grid(first: Field) -> str:
    grid, unit = first.grid, first.units.length
    words = [f"{grid.x.size} x {grid.y.size} nodes"]
    for letter, axis, spacing, even in zip(
        "xy", (grid.x, grid.y), grid.spacing, grid.is_uniform, strict=True
    ):
        if axis.size == 1:
            words.append(f"{letter} = {axis[0]:.6g} {unit}")
        else:
            kind = "spacing" if even else "uneven, mean spacing"
            words.append(f"{letter} from {axis[0]:.6g} to {axis[-1]:.6g} {unit}, {kind} {spacing:.6g} {unit}")
    return "; ".join(words)


def _gaps(first: Field) -> str:
    parts = []
    for status in (Status.MISSING, Status.MASKED, Status.REJECTED, Status.FILLED):
        count = first.count(status)
        if count:
            parts.append(f"{count:,} {status.name.lower()} ({100 * count / first.status.size:.1f} %)")
    return "first frame: " + (", ".join(parts) if parts else "every node has a vector")


def _odd_values(layout: Layout) -> list[str]:
    """Doubts about numbers that may stand for missing ones."""
    doubts = []
    for role in ("u", "v", "w", "speed"):
        if role not in layout.roles:
            continue
        values = np.ravel(layout.source.values(layout.roles[role], 0))
        values = values[np.isfinite(values) & ~np.isin(values, layout.reading.missing)]
        for number in SENTINELS:
            for signed in (number, -number):
                count = int(np.count_nonzero(values == signed))
                if count:
                    doubts.append(
                        f'"{layout.roles[role]}" is {signed:g} at {count:,} nodes; '
                        "if that stands for no value, list it under missing"
                    )
    if {"u", "v"} <= layout.roles.keys():
        u, v = (np.ravel(layout.source.values(layout.roles[role], 0)) for role in ("u", "v"))
        still = int(np.count_nonzero((u == 0) & (v == 0)))
        if still > 1 and still < u.size:
            doubts.append(
                f"{still:,} vectors are exactly zero; if that stands for no value, mask or reject them"
            )
    return doubts


def _strongest_vorticity(first: Field) -> float | None:
    if not first.in_plane or not first.grid.is_plane:
        return None
    from fieldview.compute.quantities import quantity

    try:
        vorticity = quantity(first, "vorticity")
    except InputError:
        return None
    if not np.isfinite(vorticity).any():
        return None
    return float(vorticity.flat[np.nanargmax(np.abs(vorticity))])
