"""Repeats: does the scatter of repeats agree with the stated uncertainty?"""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QFileDialog, QLineEdit, QPushButton, QTableView

from fieldview.gui.panels.base import label
from fieldview.gui.panels.tables import Cell, CellModel, dense, fit_columns
from fieldview.gui.sheets import in_a_row
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet, told_text
from fieldview.publish import wording
from fieldview.publish.region_numbers import symbol
from fieldview.session.repeats import Repeat

COLUMNS = ("region", "number", "mean", "scatter", "stated", "Birge ratio", "repeats")


class RepeatsSheet(StudySheet):
    def __init__(self, window):
        super().__init__(
            window,
            "repeats_sheet",
            "Repeats",
            "Frames of this run, or this session and others of the same thing, taken as repeats: Type A "
            "scatter of every region number against its stated random uncertainty.",
        )
        self.resize(860, 520)
        self.begin.setText("Measure the repeats")
        self.others: tuple[Path, ...] = ()
        self.source = QPushButton("the frames of this run")
        self.source.setAutoDefault(False)
        self.source.setAccessibleName("What is repeated")
        self.source.setToolTip("Choose other sessions; this one counts too")
        self.source.clicked.connect(self._choose)
        self.frames = QLineEdit("0:")
        self.frames.setAccessibleName("Frames")
        self.frames.setToolTip("Which frames of this run, or which one of every session: mean, or a number")
        self.column.addWidget(in_a_row(label("Repeats are"), self.source, label("frames"), self.frames))
        self.table, self.rows = dense(QTableView()), CellModel(self)
        self.table.setModel(self.rows)
        self.table.setObjectName("repeats_table")
        self.table.setAccessibleName("Scatter of the repeats")
        self.table.setMinimumHeight(160)
        self.column.addWidget(self.table, 1)
        self.told = told_text("repeats_told")
        self.column.addWidget(self.told)

    def start(self) -> None:
        self.ask(work.repeated, self.others, self.frames.text().strip(), title="Measuring the repeats")

    def take(self, chosen: list[str]) -> None:
        """Sessions of the same thing beside this one."""
        self.others = tuple(Path(path) for path in chosen)
        self.source.setText(f"this session and {len(self.others)} others")
        self.frames.setText("mean")

    def show_result(self, found: list[Repeat]) -> None:
        rows = [repeat.row() for repeat in found]
        self.rows.put(COLUMNS, tuple(_cells(row) for row in rows))
        fit_columns(self.table)
        self.told.setPlainText(
            "\n".join(f"{row['region']}, {symbol(row['number'])}: {row['verdict']}" for row in rows)
        )
        self.say("")

    def _choose(self) -> None:
        dialog = QFileDialog(self, "Sessions of the same thing")
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        dialog.setFileMode(QFileDialog.FileMode.ExistingFiles)
        dialog.setNameFilters(["Sessions (*.json)"])
        dialog.filesSelected.connect(self.take)
        dialog.open()


def _cells(row: dict) -> tuple[Cell, ...]:
    unit = wording.unit_text(row["unit"])
    texts = (
        wording.plus_minus(row["mean"], row["mean_uncertainty"], row["unit"]),
        f"{wording.short(row['deviation'], digits=2)} {unit}",
        f"{wording.short(row['stated'], digits=2)} {unit}",
        wording.short(row["birge_ratio"], digits=2),
        str(row["repeats"]),
    )
    return (
        Cell(row["region"]),
        Cell(symbol(row["number"])),
        *(Cell(text, right=True) for text in texts),
    )
