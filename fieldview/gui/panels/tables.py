"""Small item models of ready texts, for tables that only show."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

from PySide6.QtCore import QAbstractTableModel, QModelIndex, Qt
from PySide6.QtGui import QColor, QFontMetrics
from PySide6.QtWidgets import QAbstractItemView, QHeaderView, QTableView

from fieldview.gui.theme import GRID, ROW, SMALL_PIXELS, font

RAW = Qt.ItemDataRole.UserRole
SLACK = 12
"""How much wider than its texts a column may stay, so that digits that come and go do not shake it. [px]"""

WIDEST = 420
"""A column of sentences goes no further; the whole sentence is in the tip. [px]"""


@dataclass(frozen=True)
class Cell:
    """One cell: its text, the bare value behind it, and how it is to be shown."""

    text: str = ""
    value: object = None
    right: bool = False
    muted: bool = False
    tip: str = ""
    colour: str = ""


class CellModel(QAbstractTableModel):
    """Rows of cells under column titles. New rows are put in whole; only what changed is repainted."""

    def __init__(self, parent=None):
        super().__init__(parent)
        self.titles: tuple[str, ...] = ()
        self.tips: tuple[str, ...] = ()
        self.rows: tuple[tuple[Cell, ...], ...] = ()
        self.muted = QColor()

    def put(self, titles: tuple[str, ...], rows: tuple[tuple[Cell, ...], ...], tips=()) -> None:
        if (titles, rows, tips) == (self.titles, self.rows, self.tips):
            return
        if titles == self.titles and len(rows) == len(self.rows) and rows:
            self.rows, self.tips = rows, tips
            self.dataChanged.emit(self.index(0, 0), self.index(len(rows) - 1, len(titles) - 1))
            return
        self.beginResetModel()
        self.titles, self.rows, self.tips = titles, rows, tips
        self.endResetModel()

    def rowCount(self, parent=None):
        return 0 if parent is not None and parent.isValid() else len(self.rows)

    def columnCount(self, parent=None):
        return 0 if parent is not None and parent.isValid() else len(self.titles)

    def data(self, index: QModelIndex, role=Qt.ItemDataRole.DisplayRole):
        if not index.isValid() or index.row() >= len(self.rows):
            return None
        cell = self.rows[index.row()][index.column()]
        match role:
            case Qt.ItemDataRole.DisplayRole:
                return cell.text
            case Qt.ItemDataRole.AccessibleTextRole:
                return f"{self.titles[index.column()]}: {cell.text}".strip(": ")
            case Qt.ItemDataRole.ToolTipRole:
                return cell.tip or None
            case Qt.ItemDataRole.ForegroundRole:
                if cell.colour:
                    return QColor(cell.colour)
                return self.muted if cell.muted else None
            case Qt.ItemDataRole.TextAlignmentRole:
                side = Qt.AlignmentFlag.AlignRight if cell.right else Qt.AlignmentFlag.AlignLeft
                return side | Qt.AlignmentFlag.AlignVCenter
        return cell.value if role == RAW else None

    def headerData(self, section, orientation, role=Qt.ItemDataRole.DisplayRole):
        if orientation != Qt.Orientation.Horizontal or section >= len(self.titles):
            return None
        if role == Qt.ItemDataRole.DisplayRole:
            return self.titles[section]
        if role == Qt.ItemDataRole.ToolTipRole and section < len(self.tips):
            return self.tips[section] or None
        if role == Qt.ItemDataRole.TextAlignmentRole:
            first = section == 0
            side = Qt.AlignmentFlag.AlignLeft if first else Qt.AlignmentFlag.AlignRight
            return side | Qt.AlignmentFlag.AlignVCenter
        return None


def fit_columns(view: QTableView, *, first: int = 0) -> None:
    """Make every column as wide as its texts; Qt's own way measures every cell at every change, which takes
    longer than all else together. ``first`` is what the first column needs beside its text. [px]"""
    model, header = view.model(), view.horizontalHeader()
    for column, title in enumerate(model.titles):
        wide = max([_title_width(title), *(_width(row[column].text) for row in model.rows)])
        wanted = min(wide + 2 * GRID + (first if column == 0 else 0), WIDEST)
        if not 0 <= header.sectionSize(column) - wanted <= SLACK:
            header.resizeSection(column, wanted)


@lru_cache(maxsize=4096)
def _width(text: str) -> int:
    return QFontMetrics(font()).horizontalAdvance(text)


@lru_cache(maxsize=256)
def _title_width(text: str) -> int:
    return QFontMetrics(font(pixels=SMALL_PIXELS)).horizontalAdvance(text) + 2 * GRID


def dense(view: QTableView, *, header: bool = True) -> QTableView:
    """Rows of 24 px without grid or frame."""
    view.setShowGrid(False)
    view.setFont(font())
    view.setFrameShape(QTableView.Shape.NoFrame)
    view.verticalHeader().hide()
    view.verticalHeader().setDefaultSectionSize(ROW)
    view.verticalHeader().setMinimumSectionSize(ROW - 4)
    view.horizontalHeader().setVisible(header)
    view.horizontalHeader().setHighlightSections(False)
    view.horizontalHeader().setSectionResizeMode(QHeaderView.ResizeMode.ResizeToContents)
    view.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
    view.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
    view.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
    view.setTabKeyNavigation(False)
    view.setWordWrap(False)
    return view
