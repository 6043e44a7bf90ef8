"""Over time: a probe or a region frame by frame, its spectrum, correlation and convergence."""

from __future__ import annotations

import numpy as np
from PySide6.QtWidgets import QTabBar

from fieldview.compute.quantities import QUANTITIES
from fieldview.gui.forms import number_text, read_number
from fieldview.gui.panels.base import label
from fieldview.gui.panels.plots import Plot
from fieldview.gui.sheets import in_a_row, number_entry
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet, choice, told_text
from fieldview.publish import wording
from fieldview.publish.region_numbers import symbol
from fieldview.session.traces import TITLES

PAGES = ("series", "spectrum", "autocorrelation", "convergence")


class OverTimeSheet(StudySheet):
    def __init__(self, window):
        super().__init__(
            window,
            "over_time_sheet",
            "Over time",
            "A region's number, or what a probe reads, on every frame: mean, time scale, spectrum and the "
            "frequency that stands out, each with its uncertainty.",
        )
        self.resize(820, 620)
        self.begin.setText("Follow")
        self.what = choice("What is followed")
        self.what.activated.connect(self._chosen)
        self.number = choice("Which number")
        self.place = [number_entry("Probe x"), number_entry("Probe y")]
        self.place_row = in_a_row(label("at x, y"), *self.place)
        self.column.addWidget(in_a_row(label("Follow"), self.what, self.number, self.place_row))
        self.tabs = QTabBar()
        self.tabs.setDrawBase(False)
        self.tabs.setExpanding(False)
        self.tabs.setAccessibleName("What is plotted")
        for page in PAGES:
            self.tabs.addTab(page.capitalize())
        self.tabs.currentChanged.connect(self._draw)
        self.column.addWidget(self.tabs)
        self.plot = Plot("over_time_plot")
        self.plot.setMinimumHeight(240)
        self.plot.set_theme(self.theme)
        self.column.addWidget(self.plot, 1)
        self.told = told_text("over_time_told")
        self.column.addWidget(self.told)
        self._found: work.Series | None = None
        self._fill(self.desk.picture)

    def _fill(self, picture) -> None:
        """Regions first, the chosen one before the others; then the probe at the last place held."""
        self.what.addItem("probe", None)
        for region in picture.session.regions if picture.session else ():
            self.what.addItem(region.name, region.name)
        place = self.what.findData(picture.shown.selected) if picture.shown.selected else -1
        self.what.setCurrentIndex(place if place > 0 else min(1, self.what.count() - 1))
        if picture.field is not None:
            grid = picture.field.grid
            at = picture.cursor or complex(grid.nodes[grid.shape[0] // 2, grid.shape[1] // 2])
            for entry, value in zip(self.place, (at.real, at.imag), strict=True):
                entry.setText(number_text(float(f"{value:.4g}")))
        self._chosen()

    def _chosen(self) -> None:
        region = self.what.currentData()
        self.place_row.setVisible(region is None)
        self.number.clear()
        if region is None:
            for name in QUANTITIES:
                if all(need in self.desk.picture.field.components for need in QUANTITIES[name].needs):
                    self.number.addItem(QUANTITIES[name].title, name)
            self.number.setCurrentIndex(max(0, self.number.findData("speed")))
            return
        drawn = next(r for r in self.desk.picture.session.regions if r.name == region).outline()
        names = ("circulation", "flux", "vorticity_integral", "divergence_integral", "through_flow")
        for name in names if drawn.closed else ("line_integral", "cross_flow"):
            if (name == "through_flow") == (self.desk.picture.field.w is None):
                continue
            if name == "through_flow" or self.desk.picture.field.in_plane:
                self.number.addItem(symbol(name), name)

    def start(self) -> None:
        region = self.what.currentData()
        place = None
        if region is None:
            place = tuple(read_number(entry.text()) for entry in self.place)
            if not all(isinstance(value, float) for value in place):
                self.say("Type the probe's place as two numbers.")
                return
        self.ask(work.series, place, self.number.currentData(), region or "", title="Following over the run")

    def show_result(self, found: work.Series) -> None:
        self._found = found
        self.told.setPlainText("\n".join(_told(found)))
        self.say("")
        self._draw()

    def _draw(self) -> None:
        if self._found is not None:
            _DRAW[PAGES[self.tabs.currentIndex()]](self.plot, self._found)


def _told(found: work.Series) -> list[str]:
    row = found.row
    lines = [f"{row['label']}: {row['frames']} frames, {row['missing']} without a value."]
    for key, title in TITLES.items():
        if key in row:
            part = row[key]
            lines.append(f"{title} {wording.plus_minus(part['value'], part['uncertainty'], part['unit'])}")
    if "strouhal" in row:
        part = row["strouhal"]
        shown = wording.plus_minus(part["value"], part["uncertainty"]["combined"], part["unit"])
        lines.append(f"Strouhal number {shown} on the {part['length_name']}")
    return [*lines, *row["remarks"]]


def _times(found: work.Series) -> tuple[np.ndarray, str]:
    trace = found.trace
    if np.isfinite(trace.times).all():
        return trace.times, "time [s]"
    return trace.frames + 1, "frame"


def _draw_series(plot: Plot, found: work.Series) -> None:
    at, word = _times(found)
    plot.start(word, wording.with_unit("value", found.trace.unit), zero=False)
    plot.add_line(at, found.trace.values, plot.theme.accent, spread=found.trace.uncertainties)


def _draw_spectrum(plot: Plot, found: work.Series) -> None:
    spectrum = found.spectrum
    unit = "Hz" if found.trace.interval is not None else "1/frame"
    plot.start(f"frequency [{unit}]", "log₁₀ of the spectral density", zero=False)
    if spectrum is None:
        return
    some = spectrum.frequency > 0
    with np.errstate(divide="ignore"):
        middle, low, high = (np.log10(part[some]) for part in (spectrum.density, spectrum.low, spectrum.high))
    plot.add_line(spectrum.frequency[some], middle, plot.theme.accent, spread=0.5 * (high - low))
    main = found.row["dominant_frequency"]
    plot.add_mark(main["value"], wording.plus_minus(main["value"], main["uncertainty"], main["unit"]))


def _draw_autocorrelation(plot: Plot, found: work.Series) -> None:
    unit = "s" if found.trace.interval is not None else "frames"
    plot.start(f"lag [{unit}]", "autocorrelation")
    if found.correlation is None:
        return
    lags = np.arange(found.correlation.rho.size) * found.trace.step
    plot.add_line(lags, found.correlation.rho, plot.theme.accent)
    plot.add_mark(found.row["integral_time"]["value"], "integral scale")


def _draw_convergence(plot: Plot, found: work.Series) -> None:
    curve = found.convergence
    plot.start("frames taken", wording.with_unit("mean", found.trace.unit), zero=False)
    number = np.arange(1, curve.mean.size + 1)
    plot.add_line(number, curve.mean, plot.theme.accent, spread=curve.mean_uncertainty)


_DRAW = {
    "series": _draw_series,
    "spectrum": _draw_spectrum,
    "autocorrelation": _draw_autocorrelation,
    "convergence": _draw_convergence,
}
