"""Reading sheet: what a file does not say is asked here, with the first frame drawn as it would be read."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtWidgets import (
    QComboBox,
    QDialogButtonBox,
    QFormLayout,
    QGridLayout,
    QHBoxLayout,
    QTableView,
    QVBoxLayout,
    QWidget,
)

from fieldview.compute.errors import InputError
from fieldview.files.reading import ROLES, Reading
from fieldview.gui import places, reading_work
from fieldview.gui.canvas.showing import Showing
from fieldview.gui.canvas.view import Canvas
from fieldview.gui.forms import number_text, read_number
from fieldview.gui.jobs import Answer, Jobs
from fieldview.gui.panels.base import label
from fieldview.gui.panels.tables import Cell, CellModel, dense
from fieldview.gui.picture import Picture
from fieldview.gui.sheets import Sheet, number_entry
from fieldview.session.models import Session

UNITS = {
    "length_unit": ("mm", "m", "cm", "px", "in"),
    "velocity_unit": ("m/s", "mm/s", "cm/s", "px", "mm", "ft/min"),
    "time_unit": ("s", "ms", "us"),
}
CHOICES = {
    "y_axis": ("y grows", ("up", "down")),
    "v_positive": ("a positive v points", ("up", "down")),
    "direction_zero": ("direction zero", ("north", "x")),
    "direction_sense": ("a direction says", ("towards", "from")),
    "vector_position": ("vectors stand at", ("midpoint", "first_image")),
}
NUMBERS = {"pulse_separation": "pulse separation [s]", "frame_interval": "frame interval [s]"}
UNIT_TITLES = {
    "length_unit": "unit of x and y",
    "velocity_unit": "unit of the components",
    "time_unit": "unit of time",
}


ROLES_ABREAST = 2


class ReadingSheet(Sheet):
    """Asks how files are read; opens them once nothing that must be known is missing."""

    def __init__(self, window, session: Session, path: Path | None, why: str):
        super().__init__(
            window,
            "reading_sheet",
            "How are these files read?",
            "What the file says is filled in already. Left empty is what the file says, or else is assumed; "
            "every assumption is named on the right.",
        )
        self.session, self.path = session, path
        self.resize(1000, 640)
        self.why = label(why)
        self.why.setWordWrap(True)
        self.why.setObjectName("reading_why")
        self.column.addWidget(self.why)
        both = QHBoxLayout()
        self.column.addLayout(both, 1)
        left = QVBoxLayout()
        both.addLayout(left, 1)
        left.addWidget(label("First rows of the file", "heading"))
        self.rows = CellModel(self)
        table = dense(QTableView())
        table.setAccessibleName("First rows of the file")
        table.setModel(self.rows)
        table.setMinimumHeight(150)
        left.addWidget(table)
        left.addWidget(label("Columns", "heading"))
        self.roles_grid = QGridLayout()
        self.roles_grid.setHorizontalSpacing(8)
        left.addLayout(self.roles_grid)
        self.roles: dict[str, QComboBox] = {}
        left.addWidget(label("Units, senses, times", "heading"))
        left.addLayout(self._answers())
        left.addStretch()
        both.addWidget(self._preview(), 1)
        self.open_button = self.buttons.addButton("Open", QDialogButtonBox.ButtonRole.ApplyRole)
        self.open_button.clicked.connect(self.open_files)
        cancel = self.buttons.addButton(QDialogButtonBox.StandardButton.Cancel)
        cancel.clicked.connect(self.close)
        for button in (self.open_button, cancel):
            button.setAutoDefault(False)  # Return finishes an answer, no more
        self.jobs = Jobs(self)
        self.jobs.answered.connect(self._answered)
        self.finished.connect(lambda _: self.jobs.close())
        self._signature = ""
        self.fill(session.run.reading)
        self.look()

    def _answers(self) -> QFormLayout:
        form = QFormLayout()
        self.units, self.choices, self.numbers = {}, {}, {}
        for key, known in UNITS.items():
            box = QComboBox()
            box.setEditable(True)
            box.setCompleter(None)  # "m" must not become "mm" while it is typed
            box.addItems(["", *known])
            box.setAccessibleName(UNIT_TITLES[key])
            box.setObjectName(f"reading.{key}")
            box.activated.connect(self.look)
            box.lineEdit().editingFinished.connect(self.look)
            form.addRow(label(UNIT_TITLES[key]), box)
            self.units[key] = box
        for key, (title, options) in CHOICES.items():
            box = QComboBox()
            box.addItem("not said", None)
            for option in options:
                box.addItem(option.replace("_", " "), option)
            box.setAccessibleName(title)
            box.setObjectName(f"reading.{key}")
            box.activated.connect(self.look)
            form.addRow(label(title), box)
            self.choices[key] = box
        for key, title in NUMBERS.items():
            entry = number_entry(title)
            entry.setObjectName(f"reading.{key}")
            entry.editingFinished.connect(self.look)
            form.addRow(label(title), entry)
            self.numbers[key] = entry
        return form

    def _preview(self) -> QWidget:
        box = QWidget()
        column = QVBoxLayout(box)
        column.setContentsMargins(8, 0, 0, 0)
        column.addWidget(label("As it would be read", "heading"))
        self.canvas = Canvas()
        self.canvas.setObjectName("reading_preview")
        self.canvas.setAccessibleName("The first frame as it would be read")
        self.showing = Showing(self.canvas)
        self.showing.set_theme(self.theme)
        self.doubts = label("", wrap=True)
        self.doubts.setObjectName("reading_doubts")
        self.doubts.setAccessibleName("What was found, and every doubt")
        column.addWidget(self.doubts)
        self.canvas.setMinimumHeight(260)
        self.canvas.hide()
        column.addWidget(self.canvas, 1)
        column.addStretch()
        return box

    # -- the answers ---------------------------------------------------------------------------------

    def reading(self) -> Reading:
        """What is answered so far. Raises InputError on an answer that cannot be."""
        from pydantic import ValidationError

        kept = {key: box.currentText().strip() or None for key, box in self.units.items()}
        kept |= {key: box.currentData() for key, box in self.choices.items()}
        kept |= {key: read_number(entry.text()) for key, entry in self.numbers.items()}
        columns = {box.currentData(): name for name, box in self.roles.items() if box.currentData() in ROLES}
        ignored = tuple(name for name, box in self.roles.items() if box.currentData() == "ignore")
        given = {key: value for key, value in kept.items() if value is not None}
        try:
            return Reading(**given, columns=columns, ignore=ignored)
        except ValidationError as error:
            first = error.errors()[0]
            name = str(first["loc"][0]).replace("_", " ")
            raise InputError(f"{name}: {first['msg'].removeprefix('Value error, ')}") from None

    def fill(self, reading: Reading) -> None:
        """Put answers into the sheet."""
        for key, box in self.units.items():
            box.setCurrentText(getattr(reading, key) or "")
        for key, box in self.choices.items():
            value = getattr(reading, key)
            default = Reading.model_fields[key].default
            box.setCurrentIndex(max(0, box.findData(None if value == default else value)))
        for key, entry in self.numbers.items():
            value = getattr(reading, key)
            entry.setText("" if value is None else number_text(value))

    def look(self, *_) -> None:
        """Ask how the files would be read with these answers."""
        try:
            reading = self.reading()
        except InputError as error:
            self.problem.setText(str(error))
            return
        self.problem.setText("")
        self.jobs.submit("look", reading_work.look, self.session, reading, title="First frame")

    def _answered(self, answer: Answer) -> None:
        if answer.failed:
            self.problem.setText(answer.error)
            self.open_button.setEnabled(False)
            return
        found: reading_work.Found = answer.value
        if found.signature != self._signature:
            self._signature = found.signature
            self._ask_columns(found)
            self._choose_roles(self.session.run.reading)
            remembered = places.remembered().get("readings", {}).get(found.signature)
            if isinstance(remembered, dict) and self.session.run.reading == Reading():
                self._take_up(remembered)
                return
        self._show(found)

    def _take_up(self, remembered: dict) -> None:
        """Answers given before for files with these very columns."""
        try:
            reading = Reading.model_validate(remembered)
        except ValueError:
            return
        self.fill(reading)
        self._choose_roles(reading)
        self.look()

    def _choose_roles(self, reading: Reading) -> None:
        for role, column in (*reading.columns.items(), *(("ignore", name) for name in reading.ignore)):
            name = list(self.roles)[column] if isinstance(column, int) else column
            if name in self.roles:
                self.roles[name].setCurrentIndex(self.roles[name].findData(role))

    def _ask_columns(self, found: reading_work.Found) -> None:
        while self.roles_grid.count():
            self.roles_grid.takeAt(0).widget().deleteLater()
        self.roles = {}
        for number, column in enumerate(found.columns):
            box = QComboBox()
            box.setAccessibleName(f"Role of column {column.name}")
            box.setObjectName(f"reading.column.{column.name}")
            box.addItem(f"as found: {column.role}" if column.role else "as found: channel", None)
            for role in (*ROLES, "ignore"):
                box.addItem(role.replace("_", " "), role)
            box.activated.connect(self.look)
            unit = f" [{column.unit}]" if column.unit else ""
            row, place = divmod(number, ROLES_ABREAST)
            self.roles_grid.addWidget(label(f"{column.name}{unit}"), row, 2 * place)
            self.roles_grid.addWidget(box, row, 2 * place + 1)
            self.roles_grid.setColumnStretch(2 * place + 1, 1)
            self.roles[column.name] = box

    def _show(self, found: reading_work.Found) -> None:
        titles = tuple(found.titles)
        self.rows.put(titles, tuple(tuple(Cell(text, right=True) for text in row) for row in found.rows))
        self.doubts.setText("\n".join((*found.questions, *found.sentences)))
        self.open_button.setEnabled(not found.questions)
        picture = Picture()
        if found.field is not None:
            picture = Picture(field=found.field, map=found.map).showing(
                levels=found.levels, speed=found.speed
            )
        self.canvas.setVisible(found.field is not None)
        self.showing.draw(picture)

    def open_files(self) -> None:
        """Open the files with these answers, and remember them for files that look the same."""
        try:
            reading = self.reading()
        except InputError as error:
            self.problem.setText(str(error))
            return
        if self._signature:
            readings = places.remembered().get("readings", {})
            readings = readings if isinstance(readings, dict) else {}
            kept = reading.model_dump(mode="json", exclude_none=True)
            places.remember(readings={**readings, self._signature: kept})
        run = self.session.run.model_copy(update={"reading": reading})
        session = self.session.model_copy(update={"run": run}).in_folder(self.session.folder)
        self.close()
        if self.desk.picture.session is self.session:
            self.desk.commit("Read the files differently", session)
        else:
            self.desk.adopt(session, self.path)
