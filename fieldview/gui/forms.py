"""A settings form made from a model: a row for every key with its unit, bounds and help."""

from __future__ import annotations

import types
from collections.abc import Callable
from typing import Any, Literal, Union, get_args, get_origin

from pydantic import BaseModel, ValidationError
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QComboBox, QFormLayout, QHBoxLayout, QLabel, QLineEdit, QWidget

from fieldview.compute.units import Units
from fieldview.gui.panels.base import label, set_property
from fieldview.gui.panels.switch import Switch
from fieldview.publish import wording

HIDDEN = ("step", "on", "shape", "name", "colour")


class ModelForm(QWidget):
    """Edits one model. Every finished entry calls ``changed`` with a new, valid model; what is not valid
    is marked where it stands, with the reason below, and changes nothing."""

    def __init__(self, changed: Callable[[BaseModel], None], parent=None):
        super().__init__(parent)
        self._changed = changed
        self._model: BaseModel | None = None
        self._entries: dict[str, _Entry] = {}
        self._rows = QFormLayout(self)
        self._rows.setContentsMargins(0, 2, 0, 4)
        self._rows.setHorizontalSpacing(8)
        self._rows.setVerticalSpacing(3)
        self._rows.setFieldGrowthPolicy(QFormLayout.FieldGrowthPolicy.AllNonFixedFieldsGrow)
        self._rows.setLabelAlignment(Qt.AlignmentFlag.AlignLeft)
        self._problem: QLabel | None = None

    def show_model(self, model: BaseModel, units: Units | None) -> None:
        """Fill the form; rows are made anew only for another kind of model."""
        if type(model) is not type(self._model):
            self._build(model, units)
        if model is not self._model:
            self._model = model
            self._problem.hide()
            for name, entry in self._entries.items():
                entry.show_value(getattr(model, name))

    def _build(self, model: BaseModel, units: Units | None) -> None:
        while self._rows.rowCount():
            self._rows.removeRow(0)
        self._entries = {}
        for name, info in type(model).model_fields.items():
            if name in HIDDEN:
                continue
            entry = _entry_for(info, lambda text, name=name: self._finish(name, text))
            if entry is None:
                continue
            unit = _unit_of(info, units)
            title = wording.with_unit(name.replace("_", " ").removesuffix(" deg"), unit or "1")
            caption = label(title, "muted")
            for widget in (caption, *entry.parts):
                widget.setToolTip(info.description or "")
            for number, part in enumerate(entry.parts):
                part.setAccessibleName(title if len(entry.parts) == 1 else f"{title}, part {number + 1}")
                part.setObjectName(f"form.{name}" + (f".{number}" if len(entry.parts) > 1 else ""))
            caption.setBuddy(entry.parts[0])
            self._rows.addRow(caption, entry)
            self._entries[name] = entry
        self._problem = label("", "muted", wrap=True)
        self._problem.hide()
        self._rows.addRow(self._problem)

    def _finish(self, name: str, value: Any) -> None:
        if self._model is None or value == getattr(self._model, name):
            self._entries[name].mark(False)
            return
        try:
            kept = {key: getattr(self._model, key) for key in type(self._model).model_fields}
            made = type(self._model).model_validate({**kept, name: value})
        except ValidationError as error:
            self._entries[name].mark(True)
            message = error.errors()[0]["msg"].removeprefix("Value error, ")
            self._problem.setText(f"{name.replace('_', ' ')}: {message[:1].lower()}{message[1:]}")
            self._problem.show()
            return
        self._entries[name].mark(False)
        self._problem.hide()
        self._changed(made)


class _Entry(QWidget):
    """The widgets of one key in a row."""

    def __init__(self, finished: Callable[[Any], None]):
        super().__init__()
        self.finished = finished
        self.parts: list[QWidget] = []
        self.row = QHBoxLayout(self)
        self.row.setContentsMargins(0, 0, 0, 0)
        self.row.setSpacing(4)

    def add(self, part: QWidget) -> None:
        self.parts.append(part)
        self.row.addWidget(part)

    def show_value(self, value: Any) -> None:
        raise NotImplementedError

    def mark(self, wrong: bool) -> None:
        for part in self.parts:
            set_property(part, "wrong", wrong)


class _Choice(_Entry):
    def __init__(self, finished, options: tuple, optional: bool):
        super().__init__(finished)
        box = QComboBox()
        for option in ((None,) if optional else ()) + options:
            box.addItem("not set" if option is None else str(option).replace("_", " "), option)
        box.activated.connect(lambda place: finished(box.itemData(place)))
        self.add(box)

    def show_value(self, value):
        self.parts[0].setCurrentIndex(max(0, self.parts[0].findData(value)))


class _Numbers(_Entry):
    """One number, or several; left empty where the key may be left out."""

    def __init__(self, finished, count: int, optional: bool, whole: bool, collapses: bool):
        super().__init__(finished)
        self._optional, self._whole, self._collapses = optional, whole, collapses
        for _ in range(count):
            line = QLineEdit()
            line.setMinimumWidth(40)
            line.editingFinished.connect(self._read)
            if optional:
                line.setPlaceholderText("default")
            self.add(line)

    def show_value(self, value):
        values = value if isinstance(value, tuple) else (value,) * len(self.parts)
        for line, number in zip(self.parts, values, strict=False):
            text = "" if number is None else number_text(number)
            if line.text() != text:
                line.setText(text)

    def _read(self):
        numbers = tuple(read_number(line.text(), whole=self._whole) for line in self.parts)
        if len(numbers) == 1:
            value = numbers[0]
        elif self._optional and all(n is None for n in numbers):
            value = None
        elif self._collapses and numbers[0] == numbers[1]:
            value = numbers[0]
        else:
            value = numbers
        self.finished(value)


class _Switch(_Entry):
    def __init__(self, finished):
        super().__init__(finished)
        box = Switch()
        box.clicked.connect(finished)
        self.add(box)

    def show_value(self, value):
        self.parts[0].setChecked(bool(value))


class _Words(_Entry):
    """Several words with commas between them."""

    def __init__(self, finished):
        super().__init__(finished)
        line = QLineEdit()
        line.editingFinished.connect(
            lambda: finished(tuple(word.strip() for word in line.text().split(",") if word.strip()))
        )
        self.add(line)

    def show_value(self, value):
        self.parts[0].setText(", ".join(value))


class _Text(_Entry):
    def __init__(self, finished, optional: bool):
        super().__init__(finished)
        line = QLineEdit()
        line.editingFinished.connect(lambda: finished(line.text() or (None if optional else "")))
        self.add(line)

    def show_value(self, value):
        self.parts[0].setText(value or "")


def number_text(number: float) -> str:
    """A number with all its digits, as it would be typed."""
    return str(number) if isinstance(number, int) else f"{number:.12g}"


def read_number(text: str, *, whole: bool = False) -> Any:
    """The number that was typed, decimal comma or point; the text itself if it is none."""
    plain = text.strip().replace(wording.MINUS, "-").replace(",", ".")
    if not plain:
        return None
    try:
        return int(plain) if whole else float(plain)
    except ValueError:
        return text


def _entry_for(info, finished) -> _Entry | None:
    """The fitting widgets for a key, or None for what is not edited in a form (shapes, lists of places)."""
    options = _alternatives(info.annotation)
    optional = type(None) in options
    options = [o for o in options if o is not type(None)]
    words = next((get_args(o) for o in options if get_origin(o) is Literal), None)
    if words:
        return _Choice(finished, words, optional)
    pairs = [o for o in options if get_origin(o) is tuple and len(get_args(o)) == 2 and _flat(o)]
    if pairs:
        inner_optional = any(type(None) in _alternatives(a) for a in get_args(pairs[0]))
        return _Numbers(finished, 2, optional or inner_optional, False, float in options)
    if bool in options:
        return _Switch(finished)
    if any(get_origin(o) is tuple and get_args(o) == (str, ...) for o in options):
        return _Words(finished)
    if int in options or float in options:
        return _Numbers(finished, 1, optional, float not in options, False)
    if str in options:
        return _Text(finished, optional)
    return None


def _alternatives(annotation) -> list:
    """The members of a union, with wrappers that only add bounds taken off."""
    if hasattr(annotation, "__metadata__"):
        return _alternatives(annotation.__origin__)
    if get_origin(annotation) in (Union, types.UnionType):
        return [found for part in get_args(annotation) for found in _alternatives(part)]
    return [annotation]


def _flat(annotation) -> bool:
    """Whether all parts of a tuple are numbers."""
    return all(
        found in (float, int, type(None)) for part in get_args(annotation) for found in _alternatives(part)
    )


def _unit_of(info, units: Units | None) -> str:
    """Unit of a key in the session's units, from the kind of quantity that its model states."""
    kind = (
        (info.json_schema_extra or {}).get("quantity") if isinstance(info.json_schema_extra, dict) else None
    )
    if kind == "nodes":
        return "nodes"
    if kind == "frames":
        return "frames"
    if kind == "angle":
        return "°"
    if units is None:
        return ""
    if kind in ("point", "points", "length", "lengths"):
        return units.length
    if kind in ("velocity", "velocities", "component limits"):
        return units.velocity
    return units.of(0, -1) if kind == "rate" else ""
