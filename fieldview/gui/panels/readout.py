"""Readout: the field at the pointer, and what became of the vector there."""

from __future__ import annotations

import cmath
import math

import numpy as np
from PySide6.QtGui import QColor
from PySide6.QtWidgets import QTableView

from fieldview.compute.field import Field, Status
from fieldview.gui.panels.base import Panel, label
from fieldview.gui.panels.tables import Cell, CellModel, dense
from fieldview.gui.picture import Picture
from fieldview.gui.region_text import scaled
from fieldview.publish import wording

_STATUS_WORDS = {
    Status.MEASURED: "measured",
    Status.MISSING: "missing",
    Status.MASKED: "masked",
    Status.REJECTED: "rejected",
    Status.FILLED: "filled",
}


class Readout(Panel):
    def __init__(self, desk, parent=None):
        super().__init__(desk, "readout", "Readout", parent)
        self.model = CellModel(self)
        self.view = dense(QTableView(), header=False)
        self.view.setObjectName("readout_table")
        self.view.setAccessibleName("Values at the pointer")
        self.view.verticalHeader().setDefaultSectionSize(20)
        self.view.verticalHeader().setMinimumSectionSize(20)
        self.view.setModel(self.model)
        self.view.horizontalHeader().setStretchLastSection(True)
        self.view.setSelectionMode(QTableView.SelectionMode.NoSelection)
        self.column.addWidget(self.view, 1)
        self.history = label("", "history", wrap=True)
        self.history.setAccessibleName("History of the vector")
        self.column.addWidget(self.history)
        self._drawn: tuple | None = None

    def draw(self, picture: Picture) -> None:
        shown = picture.shown
        wanted = (picture.cursor, picture.field, picture.map, shown.coverage, shown.units, picture.stale)
        if self._drawn is not None and all(a is b for a, b in zip(wanted, self._drawn, strict=True)):
            return
        self._drawn = wanted
        self.model.muted = QColor(self.theme.muted)
        node = node_near(picture.field, picture.cursor)
        if node is None:
            hint = "Point at the field." if picture.field is not None else ""
            self.model.put(("", ""), ((Cell(hint, muted=True), Cell()),) if hint else ())
            self.history.setText("")
            return
        rows = readings(picture, *node)
        self.model.put(
            ("", ""), tuple((Cell(name, muted=True), Cell(text, right=True)) for name, text in rows)
        )
        self.history.setText(past(picture.field, *node))


def node_near(field: Field | None, at: complex | None) -> tuple[int, int] | None:
    """The node whose patch holds a place of the plane: (iy, ix); None outside the grid."""
    if field is None or at is None:
        return None
    local = complex(field.grid.placement.to_lattice(at))
    found = []
    for axis, value, across in (
        (field.grid.y, local.imag, field.grid.spacing[0]),
        (field.grid.x, local.real, field.grid.spacing[1]),
    ):
        nearest = int(np.argmin(np.abs(axis - value)))
        half = np.diff(axis).max() / 2 if axis.size > 1 else (across / 2 if math.isfinite(across) else 0.5)
        if abs(axis[nearest] - value) > half:
            return None
        found.append(nearest)
    return found[0], found[1]


def readings(picture: Picture, iy: int, ix: int) -> list[tuple[str, str]]:
    """Name and value of what is known at a node, as text."""
    field, k = picture.field, picture.shown.coverage
    view = picture.unit_view
    (far, length), (fast, speed) = view.of(field.units.length), view.of(field.units.velocity)
    z = far * complex(field.grid.nodes[iy, ix])
    decimals = wording.decimals_for(None, far * field.grid.spacing[0], digits=3)
    rows = [
        ("node", f"row {iy}, col. {ix}"),
        ("x, y", f"{wording.fixed(z.real, decimals)}, {wording.fixed(z.imag, decimals)} {length}"),
    ]
    for name, values in field.components.items():
        sigma = field.error.sigma_of(name, field.grid.shape)
        spread = None if sigma is None else k * float(sigma[iy, ix])
        if field.status[iy, ix] != Status.MEASURED:
            spread = None
        rows.append((name, _value(*scaled(fast, values[iy, ix], spread), speed)))
    if field.in_plane and math.isfinite(field.u[iy, ix]):
        velocity = complex(field.u[iy, ix], field.v[iy, ix])
        rows.append(("magnitude", f"{wording.short(fast * abs(velocity), digits=4)} {speed}"))
        angle = wording.fixed(math.degrees(cmath.phase(velocity)), 1)
        rows.append(("angle", f"{angle}°"))
    shown = picture.map
    if shown is not None and shown.of is field and shown.name not in ("u", "v", "w", "speed", "direction"):
        spread = None if shown.uncertainty is None else k * float(shown.uncertainty[iy, ix])
        factor, unit = view.of(shown.unit)
        rows.append((shown.symbol, _value(*scaled(factor, shown.values[iy, ix], spread), unit)))
    rows.extend(
        (name, f"{wording.short(values[iy, ix], digits=4)} {field.channel_units.get(name, '')}".strip())
        for name, values in field.channels.items()
    )
    rows.append(("status", _STATUS_WORDS[Status(int(field.status[iy, ix]))]))
    return rows


def past(field: Field, iy: int, ix: int) -> str:
    """What became of the vector, in a sentence."""
    from fieldview.session.replay import history

    sentences = history(field, iy, ix)
    text = ", ".join(sentences)
    return f"{text[:1].upper()}{text[1:]}." if text else ""


def _value(value: float, spread: float | None, unit: str) -> str:
    if not math.isfinite(value):
        return "no value"
    if spread is None or not math.isfinite(spread):
        return f"{wording.short(value, digits=4, signed=True)} {unit}"
    shown, u_text = wording.pair(value, spread, signed=True)
    return f"{shown} ± {u_text} {unit}"
