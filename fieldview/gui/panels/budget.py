"""Budget: what contributes how much to the uncertainty of a chosen region's number."""

from __future__ import annotations

import math

from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QColor, QPainter
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QStyledItemDelegate, QTableView, QVBoxLayout, QWidget

from fieldview.gui.panels.base import label
from fieldview.gui.panels.tables import RAW, Cell, CellModel, dense
from fieldview.gui.picture import Picture
from fieldview.gui.region_text import scaled
from fieldview.gui.theme import LIGHT, Theme
from fieldview.publish import wording
from fieldview.publish.region_numbers import ENTRIES
from fieldview.publish.units_shown import UnitView

PART_WORDS = {
    "random": "scatter of the vectors",
    "scale": "length scale",
    "pulse_separation": "pulse separation",
    "gain": "instrument's gain",
    "axis_tilt": "tilt of the axes",
    "zero_offset": "velocity offset",
    "resolution": "resolution gap",
    "window": "measuring window",
    "filling": "filled vectors",
}
_SYMBOLS = {entry.key[0]: entry.symbol for entry in ENTRIES if len(entry.key) == 1}


class Budget(QWidget):
    def __init__(self, parent=None):
        super().__init__(parent)
        self.setObjectName("budget")
        self.theme: Theme = LIGHT
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 4, 0, 0)
        row = QHBoxLayout()
        self.number = QComboBox()
        self.number.setAccessibleName("Number whose budget is shown")
        self.number.activated.connect(lambda _: self._show())
        self.said = label("", "muted")
        row.addWidget(self.number)
        row.addWidget(self.said, 1)
        column.addLayout(row)
        self.model = CellModel(self)
        self.view = dense(QTableView())
        self.view.setProperty("role", "paper")
        self.view.setAccessibleName("Uncertainty budget")
        self.view.setModel(self.model)
        self.view.setItemDelegateForColumn(2, _Bar(self))
        self.view.horizontalHeader().setStretchLastSection(True)
        column.addWidget(self.view)
        self._row: dict = {}
        self._view = UnitView()
        self._coverage = 1.0

    def draw(self, picture: Picture) -> None:
        region = picture.selected
        measured = picture.measured_of(region) if region is not None else None
        row = measured.row if measured is not None else {}
        if row is self._row and (picture.shown.coverage, picture.unit_view) == (self._coverage, self._view):
            return
        self._view = picture.unit_view
        self._row, self._coverage = row, picture.shown.coverage
        names = [name for name, parts in (row.get("budget") or {}).items() if parts]
        if names != [self.number.itemData(i) for i in range(self.number.count())]:
            self.number.clear()
            for name in names:
                self.number.addItem(_SYMBOLS.get(name, name.replace("_", " ")), name)
        self._show()

    def _show(self) -> None:
        self.model.muted = QColor(self.theme.muted)
        name = self.number.currentData()
        parts = (self._row.get("budget") or {}).get(name, [])
        number = self._row.get(name) or {}
        titles = ("part", f"± U, k = {self._coverage:g}", "share of U²")
        self.model.put(
            titles, tuple(budget_rows(parts, self._coverage, self._view.of(number.get("unit", "1"))[0]))
        )
        combined = (number.get("uncertainty") or {}).get("combined")
        spread = None if combined is None else self._coverage * combined
        factor, unit = self._view.of(number.get("unit", "1"))
        self.said.setText(
            wording.plus_minus(*scaled(factor, number.get("value"), spread), unit, signed=True)
            if number
            else "Choose a region."
        )


def budget_rows(parts, coverage: float, factor: float = 1.0) -> list[tuple[Cell, ...]]:
    """A row for every contribution, largest first; one that is not known says so."""
    known = [p for p in parts if p["uncertainty"] is not None]
    total = math.fsum(p["uncertainty"] ** 2 for p in known)
    rows = []
    for part in sorted(parts, key=lambda p: -(p["uncertainty"] or 0.0)):
        u = part["uncertainty"]
        name = PART_WORDS.get(part["part"], part["part"].replace("_", " "))
        tip = f"sensitivity {wording.short(part['sensitivity'])}" if part["sensitivity"] is not None else ""
        text = "not stated" if u is None else _two_digits(factor * coverage * u)
        share = None if u is None or total == 0 else u * u / total
        rows.append(
            (
                Cell(name, part["part"], tip=tip, muted=u is None),
                Cell(text, u, right=True, muted=u is None),
                Cell("" if share is None else wording.percent(share), share),
            )
        )
    return rows


def _two_digits(u: float) -> str:
    return wording.fixed(u, wording.decimals_for(u))


class _Bar(QStyledItemDelegate):
    """A bar as long as the share, its number beside it."""

    def paint(self, painter: QPainter, option, index):
        share = index.data(RAW)
        if share is None:
            return
        theme = self.parent().theme
        painter.save()
        box = QRectF(option.rect).adjusted(4, 6, -52, -6)
        painter.fillRect(box, QColor(theme.hairline))
        box.setWidth(box.width() * share)
        painter.fillRect(box, QColor(theme.accent))
        painter.setPen(QColor(theme.text))
        painter.drawText(
            QRectF(option.rect).adjusted(0, 0, -4, 0),
            Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter,
            index.data(),
        )
        painter.restore()
