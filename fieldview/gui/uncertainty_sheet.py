"""Uncertainty sheet: how large the errors of the vectors are taken to be, and how they hang together."""

from __future__ import annotations

from PySide6.QtWidgets import QComboBox, QDialogButtonBox, QFormLayout, QHBoxLayout, QPushButton, QVBoxLayout

from fieldview.compute.errors import InputError
from fieldview.gui.desk import checked
from fieldview.gui.forms import number_text, read_number
from fieldview.gui.panels.base import label
from fieldview.gui.panels.budget import Budget
from fieldview.gui.panels.regions import coverage_choice
from fieldview.gui.sheets import Sheet, in_a_row, number_entry
from fieldview.session.models import Uncertainties

SOURCES = (
    ("none", "not stated: numbers carry no uncertainty"),
    ("given", "given here"),
    ("from file", "from the file's own columns"),
    ("estimate", "estimated from the run's own noise"),
)
OVERLAPS = ((0, 1.0), (25, 4 / 3), (50, 2.0), (75, 4.0))
"""Overlap of the interrogation windows [%] and the nodes over which errors are then correlated."""

PARTS = (
    ("scale", "Length scale, relative", "Doubles in Γ and Φ of a contour drawn on the image."),
    ("pulse_separation", "Pulse separation, relative", "Goes once into every velocity, Γ and Φ."),
    ("gain", "Gain of the instrument, relative", "A probe's calibration, common to all points."),
    ("axis_tilt", "Tilt of the axes [rad]", "Mixes ∫u·dl and cross flow of a line; closed contours not."),
    ("zero_offset", "Velocity offset", "Cancels round a closed contour; grows with a line's length."),
)


class UncertaintySheet(Sheet):
    def __init__(self, window):
        super().__init__(
            window,
            "uncertainty_sheet",
            "Uncertainty",
            "All are standard uncertainties (k = 1). What is left empty counts as not stated, and every "
            "number says so.",
        )
        self.resize(980, 620)
        form = QFormLayout()
        form.setVerticalSpacing(6)
        self.source = QComboBox()
        self.source.setAccessibleName("Where sigma comes from")
        for key, words in SOURCES:
            self.source.addItem(words, key)
        self.source.activated.connect(self._source_chosen)
        form.addRow(label("Scatter of a vector"), self.source)
        self.sigma = {name: number_entry(f"Sigma of {name}") for name in ("u", "v", "w")}
        self.sigma_row = in_a_row(*self.sigma.values())
        self.sigma_label = label("sigma of u, v, w", "muted")
        form.addRow(self.sigma_label, self.sigma_row)
        self.nodes = [number_entry("Correlated nodes along x"), number_entry("Correlated nodes along y")]
        self.overlap = QComboBox()
        self.overlap.setAccessibleName("Overlap of the windows")
        self.overlap.addItem("by overlap …", None)
        for percent, nodes in OVERLAPS:
            self.overlap.addItem(f"{percent} % overlap", nodes)
        self.overlap.activated.connect(self._overlap_chosen)
        form.addRow(label("Correlated over [nodes], x and y"), in_a_row(*self.nodes, self.overlap))
        note = (
            "Window size over spacing: 1 / (1 − overlap). Left out, errors count as independent: U is then a "
            "lower bound."
        )
        form.addRow("", label(note, "muted", wrap=True))
        self.window_size = [number_entry("Window along x"), number_entry("Window along y")]
        self.window_label = label("Measuring window")
        self.by_window = QPushButton("Nodes from it")
        self.by_window.setAccessibleName("Correlated nodes from the measuring window and the spacing")
        self.by_window.setToolTip("Correlated nodes = measuring window over node spacing, along each axis")
        self.by_window.setAutoDefault(False)
        self.by_window.clicked.connect(self._nodes_from_window)
        form.addRow(self.window_label, in_a_row(*self.window_size, self.by_window))
        note = "Left out, it is correlated nodes × spacing; 0 is a point probe."
        form.addRow("", label(note, "muted", wrap=True))
        form.addRow(label("Common to every vector", "heading"))
        self.parts, self.part_labels = {}, {}
        for key, title, sentence in PARTS:
            self.parts[key] = number_entry(title)
            self.part_labels[key] = label(title)
            form.addRow(self.part_labels[key], self.parts[key])
            form.addRow("", label(sentence, "muted", wrap=True))
        both = QHBoxLayout()
        both.setSpacing(20)
        both.addLayout(form, 3)
        both.addLayout(self._shown_budget(), 2)
        self.column.addLayout(both)
        apply = self.buttons.addButton("Apply", QDialogButtonBox.ButtonRole.ApplyRole)
        close = self.buttons.addButton(QDialogButtonBox.StandardButton.Close)
        apply.setDefault(True)
        apply.clicked.connect(self.apply)
        close.clicked.connect(self.close)
        self._shown: Uncertainties | None = None
        self.draw(self.desk.picture)

    def _shown_budget(self) -> QVBoxLayout:
        """Beside the entries: the factor k of what is shown, and what they come to for the chosen region."""
        column = QVBoxLayout()
        self.coverage = coverage_choice(self.desk)
        row = QHBoxLayout()
        row.addWidget(label("Shown everywhere with"))
        row.addWidget(self.coverage)
        row.addStretch()
        column.addLayout(row)
        column.addWidget(label("k = 1 is the standard uncertainty; 2 covers about 95 %.", "muted", wrap=True))
        self.of_region = label("", "heading")
        column.addWidget(self.of_region)
        self.budget = Budget()
        self.budget.theme = self.theme
        column.addWidget(self.budget, 1)
        return column

    def draw(self, picture) -> None:
        self.coverage.setCurrentIndex(self.coverage.findData(picture.shown.coverage))
        self.of_region.setText(f"Budget of {picture.selected.name}" if picture.selected else "Budget")
        self.budget.draw(picture)
        session = picture.session
        if session is None or session.error_model is self._shown:
            return
        self._shown = model = session.error_model
        length, time = (session.units or "m, s").split(", ")
        self.sigma_label.setText(f"sigma of u, v, w [{length}/{time}]")
        self.window_label.setText(f"Measuring window [{length}], x and y")
        self.part_labels["zero_offset"].setText(f"Velocity offset [{length}/{time}]")
        sigma = model.sigma
        source = sigma if isinstance(sigma, str) else "none" if sigma is None else "given"
        self.source.setCurrentIndex(self.source.findData(source))
        per = sigma if isinstance(sigma, dict) else dict.fromkeys("uvw", sigma)
        for name, entry in self.sigma.items():
            value = per.get(name) if source == "given" else None
            entry.setText("" if value is None else number_text(value))
        self._pair(self.nodes, model.correlation_nodes)
        self._pair(self.window_size, model.window)
        for key, entry in self.parts.items():
            value = getattr(model.systematic, key)
            entry.setText("" if value is None else number_text(value))
        self._source_chosen()

    def _pair(self, entries, value) -> None:
        values = value if isinstance(value, tuple) else (value, value)
        for entry, number in zip(entries, values, strict=True):
            entry.setText("" if number is None else number_text(number))

    def _source_chosen(self, *_):
        self.sigma_row.setEnabled(self.source.currentData() == "given")

    def _nodes_from_window(self) -> None:
        field = self.desk.picture.field
        if field is None:
            return
        sizes = [read_number(entry.text()) for entry in self.window_size]
        for entry, size, spacing in zip(self.nodes, sizes, field.grid.spacing, strict=True):
            if isinstance(size, float) and spacing > 0:
                entry.setText(number_text(round(size / spacing, 6)))

    def _overlap_chosen(self, place: int):
        nodes = self.overlap.itemData(place)
        if nodes is not None:
            for entry in self.nodes:
                entry.setText(number_text(round(nodes, 6)))

    def apply(self) -> None:
        """Put what is entered into the session, or say what is wrong with it."""
        try:
            model = checked(self.desk.picture.session, error_model=self._entered()).error_model
        except InputError as error:
            self.problem.setText(str(error))
            return
        self.problem.setText("")
        self.desk.edit("Change the uncertainties", error_model=model)

    def _entered(self) -> dict:
        source = self.source.currentData()
        sigma = source if source in ("from file", "estimate") else None
        if source == "given":
            values = {name: read_number(entry.text()) for name, entry in self.sigma.items()}
            known = {name: value for name, value in values.items() if value is not None}
            if not known:
                raise InputError("sigma: give a number for at least one component, or choose another source")
            have = self.desk.picture.field.components if self.desk.picture.field is not None else known
            alike = len(set(map(str, known.values()))) == 1 and set(known) >= set(have)
            sigma = next(iter(known.values())) if alike else known
        parts = {key: read_number(entry.text()) for key, entry in self.parts.items()}
        return {
            "sigma": sigma,
            "correlation_nodes": _both(self.nodes),
            "window": _both(self.window_size),
            "systematic": {key: value for key, value in parts.items() if value is not None},
        }


def _both(entries):
    """One number where both entries agree, a pair where they differ, None where both are empty."""
    first, second = (read_number(entry.text()) for entry in entries)
    if first is None or second is None:
        return first if second is None else second
    return first if first == second else (first, second)
