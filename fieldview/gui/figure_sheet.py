"""Figure sheet: the settings of a figure, a true preview of it, and the file it becomes."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QImage, QPixmap
from PySide6.QtWidgets import QFileDialog, QHBoxLayout, QLabel, QScrollArea

from fieldview.compute.units import Units
from fieldview.gui.forms import ModelForm
from fieldview.gui.studies import work
from fieldview.gui.studies.base import StudySheet
from fieldview.session.figures import FigureSettings

FILES = (
    "PDF (*.pdf)",
    "SVG (*.svg)",
    "PNG (*.png)",
    "Moving picture (*.gif)",
    "Moving picture (*.apng)",
)
_PAUSE_MS = 250
"""After a change, before the preview is drawn anew."""


class FigureSheet(StudySheet):
    """Edits the first figure of the session; what is drawn is what is written."""

    def __init__(self, window):
        super().__init__(
            window,
            "figure_sheet",
            "Figure",
            "The settings are part of the session, so the figure repeats. The preview is made by the very "
            "function that writes the file.",
        )
        self.resize(1080, 680)
        self.begin.setText("Write …")
        self.form = ModelForm(self._changed)
        self.preview = QLabel()
        self.preview.setObjectName("figure_preview")
        self.preview.setAccessibleName("Preview of the figure")
        self.preview.setAlignment(Qt.AlignmentFlag.AlignTop | Qt.AlignmentFlag.AlignLeft)
        paper = QScrollArea()
        paper.setWidget(self.preview)
        paper.setWidgetResizable(True)
        paper.setMinimumWidth(420)
        both = QHBoxLayout()
        both.setSpacing(16)
        both.addWidget(self.form, 2)
        both.addWidget(paper, 3)
        self.column.addLayout(both)
        self.settings = FigureSettings()
        self._drawn: tuple | None = None
        self._pause = QTimer(self)
        self._pause.setSingleShot(True)
        self._pause.setInterval(_PAUSE_MS)
        self._pause.timeout.connect(self._draw_preview)
        self.draw(self.desk.picture)

    def draw(self, picture) -> None:
        session = picture.session
        if session is None or picture.field is None:
            return
        if session.figures:
            self.settings = session.figures[0]
        elif self._drawn is None:
            name = picture.shown.quantity
            self.settings = FigureSettings(quantities=(name,), frames=str(picture.shown.frame))
        self.form.show_model(self.settings, Units.parse(session.units) if session.units else None)
        seen = (self.settings, session)
        if self._drawn is None or seen[0] != self._drawn[0] or seen[1] is not self._drawn[1]:
            self._drawn = seen
            self._pause.start()

    def start(self) -> None:
        dialog = QFileDialog(self, "Write the figure")
        dialog.setNameFilters(list(FILES))
        dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        dialog.selectFile(f"{self.settings.name}.pdf")
        dialog.fileSelected.connect(self.write)
        dialog.open()

    def write(self, chosen: str) -> None:
        """Write the figure and, beside it, its caption."""
        path = Path(chosen)
        path = path if path.suffix else path.with_suffix(".pdf")
        settings = self.settings
        if path.suffix.lower() in (".gif", ".apng") and len(self.desk.bench.frames(settings.frames)) < 2:
            settings = settings.model_copy(update={"frames": "0:"})
        self.ask(work.figure_file, settings, path, title=f"Writing {path.name}")

    def show_result(self, value) -> None:
        if isinstance(value, Path):
            self.say(f"{value.name} and its caption {value.stem}.txt were written to {value.parent}.")
            return
        image = QPixmap.fromImage(QImage.fromData(value))
        self.preview.setPixmap(image)
        self.preview.setMinimumSize(image.size())
        self.say("")

    def _draw_preview(self) -> None:
        self.ask(work.figure_preview, self.settings, title="Drawing the figure")

    def _changed(self, settings: FigureSettings) -> None:
        others = self.desk.picture.session.figures[1:]
        self.desk.edit("Change the figure", figures=(settings, *others))

    def _stop(self):
        self._pause.stop()
        super()._stop()
