"""What the panels share."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QSizePolicy, QVBoxLayout, QWidget

from fieldview.gui.picture import Picture
from fieldview.gui.theme import GRID, LIGHT, Theme


class Panel(QWidget):
    """A titled part of the window, found by its object name. ``draw`` puts a picture on it."""

    def __init__(self, desk, name: str, title: str, parent=None):
        super().__init__(parent)
        self.desk = desk
        self.theme: Theme = LIGHT
        self.setObjectName(name)
        self.setAccessibleName(title)
        self.setProperty("role", "panel")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self.column = QVBoxLayout(self)
        self.column.setContentsMargins(2 * GRID, 2 * GRID, 2 * GRID, GRID)
        self.column.setSpacing(GRID)
        self.heading_row = QHBoxLayout()
        self.heading_row.setSpacing(2 * GRID)
        self.heading = label(title, "heading")
        self.heading_row.addWidget(self.heading)
        self.column.addLayout(self.heading_row)

    def draw(self, picture: Picture) -> None:
        raise NotImplementedError

    def set_theme(self, theme: Theme) -> None:
        self.theme = theme


def label(text: str = "", role: str = "", *, wrap: bool = False) -> QLabel:
    """A line of text; ``role`` chooses its look in the style sheet."""
    made = QLabel(text)
    made.setTextFormat(Qt.TextFormat.PlainText)
    if role:
        made.setProperty("role", role)
    if wrap:
        made.setWordWrap(True)
        made.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Minimum)
    return made


def rule() -> QFrame:
    """A hairline."""
    line = QFrame()
    line.setProperty("role", "rule")
    line.setFixedHeight(1)
    return line


def set_property(widget: QWidget, name: str, value) -> None:
    """Set a property that the style sheet asks for, and restyle where it changed."""
    if widget.property(name) != value:
        widget.setProperty(name, value)
        widget.style().unpolish(widget)
        widget.style().polish(widget)
