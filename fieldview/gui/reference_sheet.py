"""Reference sheet: the length and velocity that nondimensional numbers are based on."""

from __future__ import annotations

from PySide6.QtWidgets import QDialogButtonBox

from fieldview.compute.units import Units
from fieldview.gui.forms import ModelForm
from fieldview.gui.sheets import Sheet


class ReferenceSheet(Sheet):
    def __init__(self, window):
        super().__init__(
            window,
            "reference_sheet",
            "Reference values",
            "View → Show numbers → By reference values divides lengths by the length, velocities by the "
            "velocity, and everything else by their powers.",
        )
        self.resize(420, 220)
        self.form = ModelForm(self._changed)
        self.column.addWidget(self.form)
        self.column.addStretch()
        close = self.buttons.addButton(QDialogButtonBox.StandardButton.Close)
        close.setAutoDefault(False)  # Return finishes an entry, no more
        close.clicked.connect(self.close)
        self.draw(self.desk.picture)

    def draw(self, picture) -> None:
        if picture.session is not None:
            units = Units.parse(picture.session.units) if picture.session.units else None
            self.form.show_model(picture.session.reference, units)

    def _changed(self, reference) -> None:
        self.desk.edit("Change the reference values", reference=reference)
