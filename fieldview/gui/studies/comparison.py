"""Comparison: the shown frame and another one, of this or of another session, side by side."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QFileDialog, QLineEdit, QPushButton, QTableView

from fieldview.gui.panels.base import label
from fieldview.gui.panels.switch import Switch
from fieldview.gui.panels.tables import Cell, CellModel, dense, fit_columns
from fieldview.gui.sheets import in_a_row
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet, choice, told_text
from fieldview.gui.studies.map_plot import MapPlot, range_words
from fieldview.publish import wording
from fieldview.publish.region_numbers import symbol
from fieldview.session.comparison import Comparison

COLUMNS = ("region", "number", "shown frame", "other frame", "difference", "beyond 2 u")


class ComparisonSheet(StudySheet):
    def __init__(self, window):
        super().__init__(
            window,
            "comparison_sheet",
            "Compare frames",
            "The other frame less the shown one, node by node and region by region; random errors are taken "
            "as independent.",
        )
        self.resize(900, 680)
        self.begin.setText("Compare")
        self.other: Path | None = None
        self.source = QPushButton("this session")
        self.source.setAutoDefault(False)
        self.source.setAccessibleName("Session of the other frame")
        self.source.setToolTip("Choose another session file")
        self.source.clicked.connect(self._choose)
        self.frame = QLineEdit("mean")
        self.frame.setAccessibleName("Other frame")
        self.frame.setToolTip("A number from 0, mean, or phase:8:0")
        self.shared = Switch()
        self.shared.setAccessibleName("Systematic errors are the same in both")
        self.what = choice("Component of the difference")
        for name in self.desk.picture.field.components:
            self.what.addItem(name, name)
        self.what.activated.connect(self._draw)
        self.column.addWidget(
            in_a_row(
                label("With frame"),
                self.frame,
                label("of"),
                self.source,
                self.shared,
                label("same calibration"),
                self.what,
            )
        )
        self.map = MapPlot("comparison_map")
        self.map.set_theme(self.theme)
        self.column.addWidget(self.map, 1)
        self.table, self.rows = dense(QTableView()), CellModel(self)
        self.table.setModel(self.rows)
        self.table.setObjectName("comparison_table")
        self.table.setAccessibleName("Regions of both frames")
        self.table.setMinimumHeight(150)
        self.column.addWidget(self.table)
        self.told = told_text("comparison_told")
        self.column.addWidget(self.told)
        self._found: Comparison | None = None

    def start(self) -> None:
        shown = self.desk.picture.shown.frame
        wanted = self.frame.text().strip() or "mean"
        given = (shown, self.other, wanted, self.shared.isChecked())
        self.ask(work.comparison, *given, title="Comparing frames")

    def take(self, chosen: str) -> None:
        """The session of the other frame."""
        self.other = Path(chosen)
        self.source.setText(self.other.name)

    def show_result(self, found: Comparison) -> None:
        self._found = found
        self.rows.put(COLUMNS, tuple(_cells(row) for row in found.region_rows()))
        fit_columns(self.table)
        self.told.setPlainText("\n".join(_told(row) for row in found.component_rows()))
        self.say("")
        self._draw()

    def _draw(self) -> None:
        if self._found is None:
            return
        field, name = self._found.difference, self.what.currentData()
        if name not in field.components:
            self.say(f"the other frame has no {name}")
            return
        values, length = field.components[name], field.units.length
        span = self.map.show_map(field.grid, values, self.desk.picture.unit_view, length, signed=True)
        self.say(f"difference of {name}: {range_words(span, field.units.velocity)}")

    def _choose(self) -> None:
        dialog = QFileDialog(self, "Session of the other frame")
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        dialog.setFileMode(QFileDialog.FileMode.ExistingFile)
        dialog.setNameFilters(["Sessions (*.json)"])
        dialog.fileSelected.connect(self.take)
        dialog.open()


def _told(row: dict) -> str:
    unit = wording.unit_text(row["unit"])
    text = (
        f"{row['component']}: mean {wording.short(row['mean'])} {unit}, deviation "
        f"{wording.short(row['deviation'])} {unit} at {row['nodes']} of {row['nodes_of_grid']} nodes"
    )
    if row["share_beyond"] is None:
        return text + "; no sigma is known, so it cannot be said what is more than noise"
    expected, share = wording.short(row["expected_deviation"]), wording.percent(row["share_beyond"])
    return (
        text
        + f"; expected of the random errors {expected} {unit}; {share} beyond {row['coverage_factor']:g} u"
    )


def _cells(row: dict) -> tuple[Cell, ...]:
    texts = [
        wording.plus_minus(row[side]["value"], row[side]["uncertainty"]["combined"], row[side]["unit"])
        for side in ("first", "second", "difference")
    ]
    beyond = {None: "not known", True: "yes", False: "no"}[row["beyond"]]
    return (
        Cell(row["region"]),
        Cell(symbol(row["number"])),
        *(Cell(text, right=True) for text in texts),
        Cell(beyond, right=True),
    )
