"""Phase averages: where the phase comes from, the bins of the cycle, and the average of each as a map."""

from __future__ import annotations

from PySide6.QtWidgets import QSpinBox, QTableView

from fieldview.compute.quantities import QUANTITIES, quantity
from fieldview.gui.forms import ModelForm
from fieldview.gui.panels.base import label
from fieldview.gui.panels.tables import Cell, CellModel, dense, fit_columns
from fieldview.gui.sheets import in_a_row
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet, choice, told_text
from fieldview.gui.studies.map_plot import MapPlot, range_words
from fieldview.publish import wording
from fieldview.session.models import PhaseSource

COLUMNS = ("bin", "phase [°]", "frames", "mean shift [°]", "jitter [°]", "once per cycle kept", "drift [°]")
SHOWN = ("vorticity", "u", "v", "w", "speed")


class PhaseSheet(StudySheet):
    """Edits where the session's phase comes from, and shows its averages."""

    def __init__(self, window):
        super().__init__(
            window,
            "phase_sheet",
            "Phase averages",
            "The phase of a frame is a channel of the run, or follows from a frequency and the frame's time. "
            "Every bin's average is a frame: loopflux measure --frames phase:8 measures regions on it.",
        )
        self.resize(860, 700)
        self.begin.setText("Average")
        self.form = ModelForm(self._changed)
        self.column.addWidget(self.form)
        self.bins = QSpinBox()
        self.bins.setRange(1, 360)
        self.bins.setValue(8)
        self.bins.setAccessibleName("Bins of the cycle")
        self.shown = QSpinBox()
        self.shown.setRange(0, 7)
        self.shown.setAccessibleName("Bin shown")
        self.shown.valueChanged.connect(self._draw)
        self.what = choice("Quantity of the map")
        for name in SHOWN:
            if all(need in self.desk.picture.field.components for need in QUANTITIES[name].needs):
                self.what.addItem(QUANTITIES[name].title, name)
        self.what.activated.connect(self._draw)
        self.column.addWidget(in_a_row(label("Bins"), self.bins, label("map of bin"), self.shown, self.what))
        self.table, self.rows = dense(QTableView()), CellModel(self)
        self.table.setModel(self.rows)
        self.table.setObjectName("phase_table")
        self.table.setAccessibleName("Bins of the cycle")
        self.table.setMinimumHeight(150)
        self.column.addWidget(self.table)
        self.map = MapPlot("phase_map")
        self.map.set_theme(self.theme)
        self.column.addWidget(self.map, 1)
        self.told = told_text("phase_told")
        self.column.addWidget(self.told)
        self._found: work.Phases | None = None
        self.draw(self.desk.picture)

    def draw(self, picture) -> None:
        if picture.session is not None:
            self.form.show_model(picture.session.phase or PhaseSource(frequency=1.0), None)

    def start(self) -> None:
        if self.desk.picture.session.phase is None:
            self.say("State a frequency, or the channel that holds the phase.")
            return
        self.ask(work.phases, self.bins.value(), title="Averaging by phase")

    def show_result(self, found: work.Phases) -> None:
        self._found = found
        self.rows.put(COLUMNS, tuple(_cells(row) for row in found.rows))
        fit_columns(self.table)
        self.shown.setRange(0, len(found.rows) - 1)
        self.say(f"{found.left_out} frames lie between the bins" if found.left_out else "")
        self._draw()

    def _draw(self) -> None:
        if self._found is None:
            return
        number, picture = self.shown.value(), self.desk.picture
        field = self._found.fields[number]
        if field is None:
            self.told.setPlainText("No frame falls into this bin; use fewer or wider bins.")
            return
        name = self.what.currentData()
        entry, length = QUANTITIES[name], field.units.length
        span = self.map.show_map(
            field.grid, quantity(field, name), picture.unit_view, length, signed=entry.signed
        )
        regions = [f"{region}: {symbol} {shown}" for region, symbol, shown in self._found.numbers[number]]
        colours = range_words(span, entry.unit(field.units))
        self.told.setPlainText("\n".join([colours, *regions, *field.notes]))

    def _changed(self, phase: PhaseSource) -> None:
        self.desk.edit("Change where the phase comes from", phase=phase)


def _cells(row: dict) -> tuple[Cell, ...]:
    texts = (
        wording.short(row["phase_deg"]),
        str(row["frames"]),
        *(
            wording.short(None if row[key] is None else round(row[key], 3), digits=2)
            for key in ("shift_deg", "jitter_deg")
        ),
        wording.percent(row["first_harmonic_kept"]),
        wording.short(row["drift_deg"], digits=2),
    )
    return (Cell(str(row["bin"])), *(Cell(text, right=True) for text in texts))
