"""A splitter that shares its room out once it knows how much there is."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QSplitter, QWidget


class Shared(QSplitter):
    """Parts with a hairline between them. ``shares`` are what each takes of the room when it is first shown;
    the one that ``stretches`` takes what a later change of size gives or takes."""

    def __init__(
        self, orientation: Qt.Orientation, shares: dict[QWidget, float], stretches: QWidget | None = None
    ):
        super().__init__(orientation)
        self.setHandleWidth(1)
        self.setChildrenCollapsible(False)
        for place, widget in enumerate(shares):
            self.addWidget(widget)
            self.setStretchFactor(place, 1 if stretches in (None, widget) else 0)
        self._wish: list[float] = list(shares.values())
        self.settled = False

    def wish(self, sizes: list[int]) -> None:
        """Take these sizes when first shown, in place of the shares."""
        self._wish = list(sizes)

    def showEvent(self, event):
        super().showEvent(event)
        if not self.settled:
            # sizes set before there is a room to share would be scaled to the wrong one
            room = self.width() if self.orientation() == Qt.Orientation.Horizontal else self.height()
            total = sum(self._wish)
            self.setSizes([round(room * part / total) for part in self._wish])
            self.settled = True
