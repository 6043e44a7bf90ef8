"""The banner over the canvas: what happened, where, and what to do. Never modal."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QPoint, QRect, Qt
from PySide6.QtWidgets import QFrame, QHBoxLayout, QPushButton, QWidget

from fieldview.gui.panels.base import label, set_property
from fieldview.gui.picture import Notice, Picture


class Banner(QFrame):
    """Lies in its parent, over the top of the canvas while that is there."""

    MARGIN = 12

    def __init__(self, desk, run_command, parent: QWidget, over: QWidget):
        super().__init__(parent)
        self._desk, self._run_command, self._over = desk, run_command, over
        self.setObjectName("banner")
        self.setProperty("role", "banner")
        self.setAccessibleName("Message")
        row = QHBoxLayout(self)
        row.setContentsMargins(12, 8, 8, 8)
        row.setSpacing(8)
        self.text = label("")
        self.text.setWordWrap(True)
        self.text.setObjectName("banner_text")
        self.text.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        row.addWidget(self.text, 1)
        self._offers = QHBoxLayout()
        row.addLayout(self._offers)
        self._close = QPushButton("Close")
        self._close.setAccessibleName("Close the message")
        self._close.clicked.connect(desk.dismiss)
        row.addWidget(self._close, 0, Qt.AlignmentFlag.AlignTop)
        self._notice: Notice | None = None
        parent.installEventFilter(self)
        self.hide()

    def draw(self, picture: Picture) -> None:
        notice = picture.notice
        if notice is self._notice:
            return
        self._notice = notice
        if notice is None:
            self.hide()
            return
        self.text.setText(notice.text)
        set_property(self, "grave", notice.grave)
        while self._offers.count():
            self._offers.takeAt(0).widget().deleteLater()
        for text, command in notice.offers:
            button = QPushButton(text)
            button.clicked.connect(lambda _=False, command=command: self._run_command(command))
            self._offers.addWidget(button, 0, Qt.AlignmentFlag.AlignTop)
        self.show()
        self.raise_()
        self._place()

    def eventFilter(self, watched, event):
        if event.type() == QEvent.Type.Resize and self.isVisible():
            self._place()
        return False

    def _place(self):
        place = self.parent().rect()
        if self._over.isVisible():
            place = QRect(self._over.mapTo(self.parent(), QPoint()), self._over.size())
        width = min(place.width() - 2 * self.MARGIN, 760)
        width = max(width, 200)
        self.resize(width, self.layout().totalHeightForWidth(width))
        self.move(place.center().x() - width // 2, place.top() + self.MARGIN)
