"""Choices: how much of a region's numbers is the analyst."""

from __future__ import annotations

from PySide6.QtWidgets import QTableView

from fieldview.gui.panels.base import label
from fieldview.gui.panels.tables import Cell, CellModel, dense, fit_columns
from fieldview.gui.sheets import in_a_row
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet, choice, told_text
from fieldview.publish import wording
from fieldview.publish.region_numbers import symbol
from fieldview.session.choices import TITLES, Study

COLUMNS = ("number", "measured", "the analyst", "over the uncertainty", "from", "to", "what scatters it most")


class ChoicesSheet(StudySheet):
    def __init__(self, window):
        super().__init__(
            window,
            "choices_sheet",
            "How much is the analyst?",
            "The region is measured under every combination of defensible choices: median threshold, "
            "filling, derivative scheme, line interpolant, contour moved and scaled by half a spacing. "
            "The scatter stands beside the uncertainty and is no part of it.",
        )
        self.resize(900, 420)
        self.begin.setText("Study")
        self.region = choice("Region of the study")
        picture = self.desk.picture
        for region in picture.session.regions:
            self.region.addItem(region.name, region.name)
        self.region.setCurrentIndex(max(0, self.region.findData(picture.shown.selected)))
        self.column.addWidget(in_a_row(label("Region"), self.region))
        self.table, self.rows = dense(QTableView()), CellModel(self)
        self.table.setModel(self.rows)
        self.table.setObjectName("choices_table")
        self.table.setAccessibleName("Scatter of the choices")
        self.column.addWidget(self.table, 1)
        self.told = told_text("choices_told")
        self.column.addWidget(self.told)

    def start(self) -> None:
        frame = self.desk.picture.shown.frame
        self.ask(work.choices, self.region.currentData(), frame, title="Trying the choices")

    def show_result(self, study: Study) -> None:
        self.rows.put(COLUMNS, tuple(_cells(row) for row in study.summary()))
        fit_columns(self.table)
        count = f"{len(study.rows)} combinations on frame {study.frame + 1}"
        self.told.setPlainText("\n".join([count, *study.remarks()]))
        self.say("")


def _cells(row: dict) -> tuple[Cell, ...]:
    measured = row["measured"]
    alone = {factor: part["deviation"] or 0.0 for factor, part in row["alone"].items()}
    most = max(alone, key=alone.get)
    unit = wording.unit_text(row["unit"])
    deviation = "–" if row["deviation"] is None else f"± {wording.short(row['deviation'], digits=2)} {unit}"
    texts = (
        wording.plus_minus(measured["value"], measured["uncertainty"]["combined"], row["unit"]),
        deviation,
        wording.short(row["deviation_over_uncertainty"], digits=2),
        wording.short(row["lowest"], digits=4),
        wording.short(row["highest"], digits=4),
    )
    return (
        Cell(symbol(row["number"])),
        *(Cell(text, right=True) for text in texts),
        Cell(TITLES[most] if alone[most] > 0 else "nothing"),
    )
