"""The empty window: what to do first."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QGridLayout, QHBoxLayout, QPushButton, QVBoxLayout, QWidget

from fieldview.gui.panels.base import label


class Start(QWidget):
    """Three steps, the buttons for the first, and what was open lately."""

    STEPS = (
        ("1", "Open a run", "a folder of measured frames, single files, or a session saved before"),
        ("2", "Draw a contour", "polygon G, rectangle R, circle C, straight on the field"),
        ("3", "Read the numbers", "circulation and flux with their uncertainty stand beside it"),
    )

    def __init__(self, run_command, open_paths, parent=None):
        super().__init__(parent)
        self.setObjectName("start")
        self.setAccessibleName("Start")
        self.setProperty("role", "paper")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self._open_paths = open_paths
        outer = QVBoxLayout(self)
        outer.addStretch(2)
        middle = QVBoxLayout()
        middle.setSpacing(14)
        middle.addWidget(label("Circulation and flux from measured velocity fields", "title"))
        middle.addLayout(self._steps())
        row = QHBoxLayout()
        for text, command in (
            ("Open files …", "session.open"),
            ("Open a folder …", "session.open_folder"),
            ("Try a sample", "session.sample"),
        ):
            button = QPushButton(text)
            button.setObjectName(f"start.{command}")
            button.clicked.connect(lambda _=False, command=command: run_command(command))
            row.addWidget(button)
        row.addStretch()
        middle.addLayout(row)
        middle.addWidget(label("Or drop files or a folder anywhere on this window.", "muted"))
        self._recent = QVBoxLayout()
        self._recent.setSpacing(4)
        middle.addLayout(self._recent)
        centred = QHBoxLayout()
        centred.addStretch(1)
        centred.addLayout(middle)
        centred.addStretch(1)
        outer.addLayout(centred)
        outer.addStretch(3)

    def _steps(self) -> QGridLayout:
        grid = QGridLayout()
        grid.setHorizontalSpacing(12)
        grid.setVerticalSpacing(8)
        for row, (number, title, detail) in enumerate(self.STEPS):
            grid.addWidget(label(number, "heading"), row, 0)
            grid.addWidget(label(title), row, 1)
            grid.addWidget(label(detail, "muted"), row, 2)
        grid.setColumnStretch(2, 1)
        return grid

    def show_recent(self, paths: list[str]) -> None:
        """Buttons for what was open lately."""
        while self._recent.count():
            self._recent.takeAt(0).widget().deleteLater()
        if paths:
            self._recent.addWidget(label("Lately open", "heading"))
        for path in paths[:5]:
            button = QPushButton(f"{Path(path).name}   ·   {Path(path).parent}")
            button.setFlat(True)
            button.setStyleSheet("text-align: left;")
            button.clicked.connect(lambda _=False, path=path: self._open_paths([path]))
            self._recent.addWidget(button)
