"""Statistics of the run as maps, and the two-point correlation about a place."""

from __future__ import annotations

import numpy as np

from fieldview.gui.panels.base import label
from fieldview.gui.panels.switch import Switch
from fieldview.gui.sheets import in_a_row
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet, choice, told_text
from fieldview.gui.studies.map_plot import MapPlot, range_words
from fieldview.publish import wording

UNSIGNED = ("count", "std", "kinetic", "kurtosis", "effective", "integral_time")
"""Parts of the names of statistics that have no sign."""


class StatisticsSheet(StudySheet):
    def __init__(self, window):
        super().__init__(
            window,
            "statistics_sheet",
            "Statistics over the run",
            "Measured vectors only; filled ones are left out. Uncertainties come from the effective number "
            "of independent frames.",
        )
        self.resize(860, 620)
        self.begin.setText("Go through the run")
        self.choice = choice("Statistic")
        self.choice.activated.connect(self._draw)
        self.spread, self.noise = Switch(), Switch()
        self.spread.setAccessibleName("Show the standard uncertainty")
        self.spread.toggled.connect(self._draw)
        self.noise.setAccessibleName("Take the noise's variance off the stresses")
        self.noise.toggled.connect(self.start)
        self.column.addWidget(
            in_a_row(
                label("Map of"),
                self.choice,
                self.spread,
                label("its standard uncertainty"),
                self.noise,
                label("noise taken off the stresses"),
            )
        )
        self.map = MapPlot("statistics_map")
        self.map.set_theme(self.theme)
        self.column.addWidget(self.map, 1)
        self.told = told_text("statistics_told")
        self.column.addWidget(self.told)
        self._found: work.Statistics | None = None
        self.start()

    def start(self) -> None:
        self.ask(work.statistics, self.noise.isChecked(), title="Statistics over the run")

    def show_result(self, found: work.Statistics) -> None:
        self._found = found
        kept = self.choice.currentData()
        self.choice.clear()
        for name, entry in found.maps.items():
            self.choice.addItem(entry.title, name)
        self.choice.setCurrentIndex(max(1, self.choice.findData(kept)))
        self.say("")
        self._draw()

    def _draw(self) -> None:
        if self._found is None or self.choice.currentData() is None:
            return
        found, picture = self._found, self.desk.picture
        name = self.choice.currentData()
        entry, unit = found.maps[name], found.units[name]
        uncertain = self.spread.isChecked()
        values = entry.uncertainty if uncertain else entry.values
        if values is None:
            self.told.setPlainText(f"{entry.title} has no uncertainty.")
            values = np.full(entry.values.shape, np.nan)
        signed = not uncertain and not any(word in name for word in UNSIGNED)
        length = picture.field.units.length
        span = self.map.show_map(found.grid, values, picture.unit_view, length, signed=signed)
        known = values[np.isfinite(values)]
        middle = wording.short(float(np.median(known)), digits=4) if known.size else "–"
        lines = [
            f"{range_words(span, unit)}; median {middle} {wording.unit_text(unit)} at {known.size} nodes"
        ]
        self.told.setPlainText("\n".join([*lines, *entry.remarks, *found.remarks]))


class CorrelationSheet(StudySheet):
    def __init__(self, window):
        super().__init__(
            window,
            "correlation_sheet",
            "Two-point correlation",
            "Of one component at the place held by the probe, or the middle of the field, with itself at "
            "every other node; frames are taken as independent.",
        )
        self.resize(760, 560)
        self.begin.setText("Correlate")
        self.component = choice("Component")
        for name in self.desk.picture.field.components:
            self.component.addItem(name, name)
        self.column.addWidget(in_a_row(label("Component"), self.component))
        self.map = MapPlot("correlation_map")
        self.map.set_theme(self.theme)
        self.column.addWidget(self.map, 1)
        self.told = told_text("correlation_told")
        self.column.addWidget(self.told)

    def start(self) -> None:
        picture = self.desk.picture
        grid = picture.field.grid
        at = picture.cursor or complex(grid.nodes[grid.shape[0] // 2, grid.shape[1] // 2])
        name = self.component.currentData()
        self.ask(work.correlation, (at.real, at.imag), name, title="Correlating over the run")

    def show_result(self, found: work.TwoPointMap) -> None:
        view, unit = self.desk.picture.unit_view, self.desk.picture.field.units.length
        self.map.show_map(found.grid, found.rho, view, unit, signed=True)
        factor, shown = view.of(unit)
        ends = {"edge": ", at least: the grid ends", "gap": ", at least: a gap ends it"}
        lengths = [
            f"{along}: "
            + wording.plus_minus(factor * part.length, factor * part.uncertainty, "1")
            + f" {shown}{ends.get(part.ends, '')}"
            for along, part in found.lengths.items()
        ]
        x, y = (wording.short(factor * part) for part in (found.place.real, found.place.imag))
        head = f"about ({x}, {y}) {shown}, {found.samples} frames; integral lengths"
        self.told.setPlainText("\n".join([head, *lengths]))
        self.say("")
