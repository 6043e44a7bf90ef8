"""Run check: is the run good, item by item, with the number behind each verdict."""

from __future__ import annotations

import numpy as np
from PySide6.QtWidgets import QGridLayout, QWidget

from fieldview.gui.panels.base import label
from fieldview.gui.panels.plots import Plot
from fieldview.gui.sheets import in_a_row
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet, choice
from fieldview.gui.studies.map_plot import MapPlot, range_words

MAPS = (
    ("rejected", "share of frames rejected"),
    ("measured", "share of frames measured"),
    ("repeats", "share of frames unchanged"),
)


class RunCheckSheet(StudySheet):
    def __init__(self, window):
        super().__init__(
            window,
            "run_check",
            "Run check",
            "Every frame is looked at once, as the ledger leaves it. Each verdict stands with its number.",
        )
        self.resize(940, 640)
        self.begin.setText("Check the run")
        self.findings = QWidget()
        self.list = QGridLayout(self.findings)
        self.list.setContentsMargins(0, 0, 0, 0)
        self.list.setHorizontalSpacing(12)
        self.list.setVerticalSpacing(6)
        self.list.setColumnStretch(2, 1)
        self.column.addWidget(self.findings)
        self.frames = Plot("run_check_frames")
        self.frames.setMinimumHeight(170)
        self.map = MapPlot("run_check_map")
        for plot in (self.frames, self.map):
            plot.set_theme(self.theme)
        self.choice = choice("Map of the check")
        for key, words in MAPS:
            self.choice.addItem(words, key)
        self.choice.activated.connect(self._draw_map)
        self.range = label("", "muted")
        self.column.addWidget(self.frames)
        self.column.addWidget(in_a_row(label("Map of the"), self.choice, self.range))
        self.column.addWidget(self.map, 1)
        self._found = None
        self.start()

    def start(self) -> None:
        self.ask(work.check, title="Checking the run")

    def show_result(self, found) -> None:
        self._found = found
        while self.list.count():
            self.list.takeAt(0).widget().deleteLater()
        for row, finding in enumerate(found.rows()):
            concern = label(finding["concern"], "muted" if finding["concern"] == "fine" else "attention")
            concern.setObjectName("concern")
            verdict = label(finding["verdict"], wrap=True)
            verdict.setObjectName("verdict")
            for column, widget in enumerate((concern, label(finding["item"], "heading"), verdict)):
                self.list.addWidget(widget, row, column)
        self._draw_frames(found)
        self._draw_map()
        self.say(f"{len(found.frames)} frames looked at, {len(found.skipped)} could not be used")

    def _draw_frames(self, found) -> None:
        rows = found.frame_rows()
        self.frames.start("frame", "share of vectors", zero=True)
        frames = [row["frame"] + 1 for row in rows]
        self.frames.add_line(frames, [row["measured"] for row in rows], self.theme.accent)
        rejected = [np.nan if row["rejected"] is None else row["rejected"] for row in rows]
        self.frames.add_line(frames, rejected, self.theme.attention, dash=(4, 3))
        self.frames.getPlotItem().setTitle("solid: measured · dashed: rejected", size="11px")

    def _draw_map(self) -> None:
        if self._found is None:
            return
        picture = self.desk.picture
        values = getattr(self._found, self.choice.currentData())
        span = self.map.show_map(
            picture.field.grid, values, picture.unit_view, picture.field.units.length, signed=False
        )
        self.range.setText(range_words(span, "1"))
