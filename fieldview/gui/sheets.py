"""Sheets: windows beside the main one for what is set once: errors, calibration, reference. None blocks."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QDialog,
    QDialogButtonBox,
    QFrame,
    QHBoxLayout,
    QLineEdit,
    QScrollArea,
    QVBoxLayout,
    QWidget,
)

from fieldview.gui.panels.base import label


class Sheet(QDialog):
    """A titled page with its buttons. ``draw`` is called with every new picture while it is open."""

    def __init__(self, window, name: str, title: str, purpose: str):
        super().__init__(window)
        self.window_, self.desk, self.theme = window, window.desk, window.theme
        self.setObjectName(name)
        self.setWindowTitle(title)
        self.setAccessibleName(title)
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.setModal(False)
        outer = QVBoxLayout(self)
        outer.setContentsMargins(12, 12, 12, 12)
        outer.addWidget(label(purpose, "muted", wrap=True))
        page = QWidget()
        self.column = QVBoxLayout(page)
        self.column.setContentsMargins(0, 4, 8, 4)
        self.column.setSpacing(6)
        scroll = QScrollArea()
        scroll.setFrameShape(QFrame.Shape.NoFrame)
        scroll.setWidgetResizable(True)
        scroll.setWidget(page)
        scroll.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        scroll.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self._page = page
        outer.addWidget(scroll, 1)
        self.problem = label("", "muted", wrap=True)
        self.problem.setObjectName("sheet_problem")
        outer.addWidget(self.problem)
        self.buttons = QDialogButtonBox()
        outer.addWidget(self.buttons)
        self.desk.redrawn.connect(self._redraw)
        self.finished.connect(self._stop)

    def draw(self, picture) -> None:
        """Show what the picture has to say."""

    def showEvent(self, event):
        # wide enough for every entry, and as high as the page where the screen allows it
        wanted = self._page.minimumSizeHint()
        room = self.screen().availableSize()
        wide = min(max(self.width(), wanted.width() + 44), room.width() - 40)
        high = min(max(self.height(), wanted.height() + 120), room.height() - 60)
        self.resize(wide, high)
        super().showEvent(event)

    def _redraw(self):
        self.draw(self.desk.picture)

    def _stop(self):
        self.desk.redrawn.disconnect(self._redraw)


def number_entry(name: str) -> QLineEdit:
    """A line for a number, found and read out by its name."""
    entry = QLineEdit()
    entry.setAccessibleName(name)
    entry.setObjectName(name)
    entry.setMinimumWidth(56)
    return entry


def in_a_row(*widgets: QWidget) -> QWidget:
    box = QWidget()
    row = QHBoxLayout(box)
    row.setContentsMargins(0, 0, 0, 0)
    row.setSpacing(4)
    for widget in widgets:
        row.addWidget(widget)
    return box
