"""Regions: the table of numbers ± U."""

from __future__ import annotations

from PySide6.QtCore import QModelIndex, QSize, Qt
from PySide6.QtGui import QColor, QIcon, QPainter, QPen, QPixmap
from PySide6.QtWidgets import QComboBox, QHeaderView, QTableView

from fieldview.gui import theme as themes
from fieldview.gui.panels.base import Panel, label
from fieldview.gui.panels.region_table import table
from fieldview.gui.panels.tables import CellModel, dense, fit_columns
from fieldview.gui.picture import Picture


class RegionModel(CellModel):
    """The table's cells; the first column can be edited, which renames the region."""

    def __init__(self, desk, parent=None):
        super().__init__(parent)
        self._desk = desk

    def flags(self, index: QModelIndex):
        flags = super().flags(index)
        return flags | Qt.ItemFlag.ItemIsEditable if index.column() == 0 else flags

    def data(self, index, role=Qt.ItemDataRole.DisplayRole):
        if role == Qt.ItemDataRole.DecorationRole and index.column() == 0:
            regions = self._desk.picture.regions
            if index.row() < len(regions):
                return _swatch(themes.region_colour(regions[index.row()].colour, index.row()), index.row())
        if role == Qt.ItemDataRole.EditRole and index.column() == 0:
            return super().data(index, Qt.ItemDataRole.DisplayRole)
        return super().data(index, role)

    def setData(self, index, value, role=Qt.ItemDataRole.EditRole):
        name = str(value).strip()
        region = self._desk.picture.session.regions[index.row()]
        if not name or name == region.name:
            return False
        self._desk.change_region(
            region.name, region.model_copy(update={"name": name}), f"Rename {region.name}"
        )
        return True


class Regions(Panel):
    def __init__(self, desk, parent=None):
        super().__init__(desk, "regions", "Regions", parent)
        self.setProperty("role", "paper")
        self._coverage = coverage_choice(desk)
        self._said = label("", "muted")
        self.heading_row.addWidget(self._said)
        self.heading_row.addStretch()
        self.heading_row.addWidget(self._coverage)
        self._seen: tuple = ()
        self.model = RegionModel(desk, self)
        self.view = dense(QTableView())
        self.view.setProperty("role", "paper")
        self.view.horizontalHeader().setSectionResizeMode(QHeaderView.ResizeMode.Interactive)
        self.view.setObjectName("regions_table")
        self.view.setAccessibleName("Regions and their numbers")
        self.view.setModel(self.model)
        self.view.setIconSize(QSize(16, 12))
        self.view.selectionModel().currentRowChanged.connect(self._chosen)
        self.view.activated.connect(self._opened)
        self.column.addWidget(self.view)
        self._empty = label(
            "No region yet. Choose a tool (G polygon, R rectangle, C circle) and draw on the canvas.", "muted"
        )
        self.column.addWidget(self._empty)

    def draw(self, picture: Picture) -> None:
        self.model.muted = QColor(self.theme.muted)
        measured = [picture.measured_of(region) for region in picture.regions]
        seen = (*picture.regions, *measured, picture.shown.coverage, picture.shown.units)
        seen = (*seen, picture.session.reference if picture.session else None, picture.stale, self.theme)
        if len(seen) != len(self._seen) or any(a is not b for a, b in zip(seen, self._seen, strict=True)):
            self._seen = seen
            self.model.put(*table(picture))
            fit_columns(self.view, first=24)
        self.view.setVisible(bool(picture.regions))
        self._empty.setVisible(not picture.regions)
        k = picture.shown.coverage
        kind = "standard uncertainties" if k == 1 else f"all uncertainties expanded, k = {k:g}"
        self._said.setText(f"· {kind}" + (" · working …" if picture.stale else ""))
        place = self._coverage.findData(k)
        if place >= 0 and place != self._coverage.currentIndex():
            self._coverage.setCurrentIndex(place)
        self._mark_selected(picture)

    def _mark_selected(self, picture: Picture) -> None:
        names = [r.name for r in picture.regions]
        if picture.shown.selected in names:
            row = names.index(picture.shown.selected)
            if self.view.currentIndex().row() != row:
                column = max(0, self.view.currentIndex().column())
                self.view.setCurrentIndex(self.model.index(row, column))
        elif self.view.currentIndex().isValid():
            self.view.setCurrentIndex(QModelIndex())

    def _opened(self, index: QModelIndex) -> None:
        """A row opens to its uncertainty budget."""
        if index.column() > 0:
            self.desk.show(drawer="budget")

    def _chosen(self, current: QModelIndex, _before) -> None:
        regions = self.desk.picture.regions
        if current.isValid() and current.row() < len(regions):
            self.desk.show(selected=regions[current.row()].name)


def coverage_choice(desk) -> QComboBox:
    """A box with the factors k that uncertainties are shown with."""
    choice = QComboBox()
    choice.setAccessibleName("Coverage factor")
    choice.setToolTip("Factor by which the uncertainties are multiplied for showing")
    for k in (1.0, 2.0, 3.0):
        choice.addItem(f"k = {k:g}", k)
    choice.activated.connect(lambda place: desk.show(coverage=choice.itemData(place)))
    return choice


def _swatch(colour: str, place: int) -> QIcon:
    """A short piece of the region's outline: its colour and its dash."""
    pixmap = QPixmap(32, 24)
    pixmap.setDevicePixelRatio(2)
    pixmap.fill(Qt.GlobalColor.transparent)
    with QPainter(pixmap) as painter:
        pen = QPen(QColor(colour), 2.5)
        if themes.region_dash(place):
            pen.setDashPattern([d / 1.6 for d in themes.region_dash(place)])
        painter.setPen(pen)
        painter.drawLine(0, 6, 16, 6)
    return QIcon(pixmap)
