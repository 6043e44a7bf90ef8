"""Shape: the chosen region's coordinates, to be read and typed exactly."""

from __future__ import annotations

from dataclasses import dataclass

from PySide6.QtCore import QAbstractTableModel, QModelIndex, Qt
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import QTableView, QVBoxLayout, QWidget

from fieldview.gui import shaping
from fieldview.gui.forms import number_text, read_number
from fieldview.gui.panels.tables import dense
from fieldview.gui.picture import Picture


@dataclass(frozen=True)
class Place:
    """One row: what it is called, its numbers, and the region's key (and index) that it belongs to."""

    name: str
    numbers: tuple[float, ...]
    key: str
    index: int | None = None


def places_of(region) -> list[Place]:
    """The numbers that make a region, row by row."""
    if region is None:
        return []
    match region.shape:
        case "circle":
            return [Place("centre", region.centre, "centre"), Place("radius", (region.radius,), "radius")]
        case "ellipse":
            return [
                Place("centre", region.centre, "centre"),
                Place("semi-axes", region.semi_axes, "semi_axes"),
                Place("angle [°]", (region.angle_deg,), "angle_deg"),
            ]
        case "rectangle":
            return [Place(f"corner {i + 1}", c, "corners", i) for i, c in enumerate(region.corners)]
        case _:
            return [Place(f"point {i + 1}", p, "points", i) for i, p in enumerate(region.points)]


def with_number(region, place: Place, part: int, number: float):
    """The region with one of its numbers changed."""
    numbers = tuple(number if i == part else n for i, n in enumerate(place.numbers))
    if place.index is not None:
        rows = list(getattr(region, place.key))
        rows[place.index] = numbers
        return region.model_copy(update={place.key: tuple(rows)})
    return region.model_copy(update={place.key: numbers if len(numbers) > 1 else numbers[0]})


class ShapeModel(QAbstractTableModel):
    """Name, x and y of every place; the numbers can be edited."""

    def __init__(self, desk, parent=None):
        super().__init__(parent)
        self._desk = desk
        self.region = None
        self.places: list[Place] = []
        self.length = "m"

    def put(self, region, length: str) -> None:
        places = places_of(region)
        if len(places) != len(self.places) or length != self.length:
            self.beginResetModel()
            self.region, self.places, self.length = region, places, length
            self.endResetModel()
        elif region is not self.region:
            self.region, self.places = region, places
            if places:
                self.dataChanged.emit(self.index(0, 0), self.index(len(places) - 1, 2))

    def rowCount(self, parent=None):
        return 0 if parent is not None and parent.isValid() else len(self.places)

    def columnCount(self, parent=None):
        return 0 if parent is not None and parent.isValid() else 3

    def headerData(self, section, orientation, role=Qt.ItemDataRole.DisplayRole):
        if orientation == Qt.Orientation.Horizontal and role == Qt.ItemDataRole.DisplayRole:
            return ("", f"x [{self.length}]", f"y [{self.length}]")[section]
        return None

    def data(self, index: QModelIndex, role=Qt.ItemDataRole.DisplayRole):
        place, part = self.places[index.row()], index.column() - 1
        if role == Qt.ItemDataRole.TextAlignmentRole and part >= 0:
            return Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
        if role not in (Qt.ItemDataRole.DisplayRole, Qt.ItemDataRole.EditRole):
            return None
        if part < 0:
            return place.name
        if part >= len(place.numbers):
            return ""
        number = place.numbers[part]
        return number_text(number) if role == Qt.ItemDataRole.EditRole else f"{number:.6g}"

    def flags(self, index):
        flags = super().flags(index)
        part = index.column() - 1
        editable = 0 <= part < len(self.places[index.row()].numbers)
        return flags | Qt.ItemFlag.ItemIsEditable if editable else flags

    def setData(self, index, value, role=Qt.ItemDataRole.EditRole):
        place, part = self.places[index.row()], index.column() - 1
        number = read_number(str(value))
        if not isinstance(number, float):
            self._desk.complain(f'{place.name}: "{value}" is no number; type one like 0.025.')
            return False
        if number == place.numbers[part]:
            return False
        changed = with_number(self.region, place, part, number)
        before = self._desk.picture.session
        self._desk.change_region(self.region.name, changed, f"Reshape {self.region.name}")
        return self._desk.picture.session is not before


class Shape(QWidget):
    def __init__(self, desk, parent=None):
        super().__init__(parent)
        self.setObjectName("shape")
        self._desk = desk
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 4, 0, 0)
        self.model = ShapeModel(desk, self)
        self.view = dense(QTableView())
        self.view.setProperty("role", "paper")
        self.view.setSelectionBehavior(QTableView.SelectionBehavior.SelectItems)
        self.view.setAccessibleName("Coordinates of the chosen region")
        self.view.setModel(self.model)
        column.addWidget(self.view)
        remove = QShortcut(QKeySequence("Del"), self.view)
        remove.setContext(Qt.ShortcutContext.WidgetShortcut)
        remove.activated.connect(self.remove_point)

    def draw(self, picture: Picture) -> None:
        length = picture.field.units.length if picture.field is not None else "m"
        self.model.put(picture.selected, length)

    def remove_point(self) -> None:
        """Take the point under the cursor out of a polygon or line."""
        region, row = self.model.region, self.view.currentIndex().row()
        fewer = shaping.without_point(region, row) if region is not None and row >= 0 else None
        if fewer is not None:
            self._desk.change_region(region.name, fewer, f"Remove a corner of {region.name}")
