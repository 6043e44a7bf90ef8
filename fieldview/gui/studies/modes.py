"""Modes of the run: energy shares, every mode as a map, and a frame from only a few of them."""

from __future__ import annotations

import numpy as np
from PySide6.QtWidgets import QSpinBox

from fieldview.compute.quantities import QUANTITIES, quantity
from fieldview.gui.panels.base import label
from fieldview.gui.panels.plots import Plot
from fieldview.gui.sheets import in_a_row
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet, choice, told_text
from fieldview.gui.studies.map_plot import MapPlot, range_words
from fieldview.publish import wording

SHOWN = ("vorticity", "u", "v", "w", "speed")


class ModesSheet(StudySheet):
    def __init__(self, window):
        super().__init__(
            window,
            "modes_sheet",
            "Modes of the run",
            "Proper orthogonal decomposition of the fluctuation by snapshots; gaps are filled by the modes "
            "themselves.",
        )
        self.resize(900, 680)
        self.begin.setText("Find modes")
        self.count = QSpinBox()
        self.count.setRange(1, 50)
        self.count.setValue(10)
        self.count.setAccessibleName("Modes to keep")
        self.mode = QSpinBox()
        self.mode.setRange(1, 10)
        self.mode.setAccessibleName("Mode shown")
        self.mode.valueChanged.connect(self._draw)
        self.view = choice("What is mapped")
        self.view.addItem("mode alone", "mode")
        self.view.addItem("shown frame from the mean and the modes up to it", "reconstruction")
        self.view.activated.connect(self._draw)
        self.what = choice("Quantity of the map")
        components = self.desk.picture.field.components
        for name in SHOWN:
            if all(need in components for need in QUANTITIES[name].needs):
                self.what.addItem(QUANTITIES[name].title, name)
        self.what.activated.connect(self._draw)
        self.column.addWidget(in_a_row(label("Keep"), self.count, label("modes")))
        self.energies = Plot("modes_energies")
        self.energies.setMinimumHeight(150)
        self.map = MapPlot("modes_map")
        for plot in (self.energies, self.map):
            plot.set_theme(self.theme)
        self.column.addWidget(self.energies)
        self.column.addWidget(in_a_row(label("Mode"), self.mode, self.view, self.what))
        self.column.addWidget(self.map, 1)
        self.told = told_text("modes_told")
        self.column.addWidget(self.told)
        self._found = None

    def start(self) -> None:
        self.ask(work.modes, self.count.value(), title="Modes of the run")

    def show_result(self, found) -> None:
        self._found = found
        self.mode.setRange(1, len(found.modes.modes))
        rows = found.rows()
        numbers = [row["mode"] for row in rows]
        shares = np.array([row["share"] for row in rows])
        spread = np.array([row["energy"]["uncertainty"] for row in rows])
        total = rows[0]["energy"]["value"] / shares[0] if shares[0] > 0 else 1.0
        self.energies.start("mode", "share of the energy")
        self.energies.add_line(numbers, shares, self.theme.accent, spread=spread / total)
        self.say("")
        self._draw()

    def _draw(self) -> None:
        if self._found is None:
            return
        found, picture, number = self._found, self.desk.picture, self.mode.value()
        row = found.rows()[number - 1]
        if self.view.currentData() == "mode":
            field = found.mode_field(number)
        else:
            frame = picture.shown.frame
            if frame not in found.frames:
                self.told.setPlainText(f"frame {frame + 1} could not be read and takes no part")
                return
            field = found.reconstruction(frame, count=number)
        name = self.what.currentData()
        values = quantity(field, name)
        unit = QUANTITIES[name].unit(field.units)
        signed = QUANTITIES[name].signed
        length = field.units.length
        span = self.map.show_map(field.grid, values, picture.unit_view, length, signed=signed)
        energy = row["energy"]
        shown = wording.plus_minus(energy["value"], energy["uncertainty"], energy["unit"])
        mixed = "" if row["apart"] else "; not clear of its neighbours"
        lines = [
            f"mode {number}: energy {shown}, {wording.percent(row['share'])}, "
            f"{wording.percent(row['cumulative'])} with those before it{mixed}",
            range_words(span, unit),
        ]
        self.told.setPlainText("\n".join([*lines, *field.notes[:1], *found.remarks()]))
