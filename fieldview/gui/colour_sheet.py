"""Colour range: the values at the two ends of the colour bar, typed or taken from the frame."""

from __future__ import annotations

import numpy as np
from PySide6.QtWidgets import QDialogButtonBox, QFormLayout, QPushButton

from fieldview.gui.forms import number_text, read_number
from fieldview.gui.panels.base import label
from fieldview.gui.pursuit import levels_of
from fieldview.gui.sheets import Sheet, in_a_row, number_entry


class ColourSheet(Sheet):
    def __init__(self, window):
        super().__init__(
            window,
            "colour_sheet",
            "Colour range",
            "The range stays the same from frame to frame. Values beyond it take the colours of the ends. A "
            "range that is not symmetric about zero is drawn without the sign's two colours.",
        )
        self.resize(400, 240)
        form = QFormLayout()
        self.low, self.high = (
            number_entry("Value of the first colour"),
            number_entry("Value of the last colour"),
        )
        self.title = label("")
        form.addRow(self.title)
        form.addRow(label("first colour"), self.low)
        form.addRow(label("last colour"), self.high)
        frame, values = QPushButton("Round, for this frame"), QPushButton("Least to greatest")
        for button, take in ((frame, self._round), (values, self._tight)):
            button.setAutoDefault(False)
            button.clicked.connect(take)
        form.addRow("", in_a_row(frame, values))
        self.column.addLayout(form)
        self.column.addStretch()
        apply = self.buttons.addButton("Apply", QDialogButtonBox.ButtonRole.ApplyRole)
        apply.setDefault(True)
        apply.clicked.connect(self.apply)
        self.buttons.addButton(QDialogButtonBox.StandardButton.Close).clicked.connect(self.close)
        self._shown: tuple | None = None
        self.draw(self.desk.picture)

    def draw(self, picture) -> None:
        shown = picture.map
        if shown is None or shown.name not in picture.shown.levels:
            return
        levels = picture.shown.levels[shown.name]
        if (shown.name, levels) == self._shown:
            return
        self._shown = (shown.name, levels)
        # what is typed is in the units that the colour bar shows
        self._factor, _ = picture.unit_view.of(shown.unit)
        self.title.setText(picture.unit_view.label(f"{shown.title} {shown.symbol}", shown.unit))
        self._put(*levels)

    def _put(self, low: float, high: float) -> None:
        for entry, value in ((self.low, low), (self.high, high)):
            entry.setText(number_text(float(f"{self._factor * value:.6g}")))

    def _round(self) -> None:
        self._put(*levels_of(self.desk.picture.map))

    def _tight(self) -> None:
        values = self.desk.picture.map.values
        if np.isfinite(values).any():
            self._put(float(np.nanmin(values)), float(np.nanmax(values)))

    def apply(self) -> None:
        """Take the range for the shown quantity."""
        low, high = read_number(self.low.text()), read_number(self.high.text())
        if not isinstance(low, float) or not isinstance(high, float) or low >= high:
            self.problem.setText("Give two numbers, the first below the last.")
            return
        self.problem.setText("")
        picture = self.desk.picture
        levels = (low / self._factor, high / self._factor)
        self.desk.show(levels={**picture.shown.levels, picture.map.name: levels})
