"""Find a command by name."""

from __future__ import annotations

from PySide6.QtCore import QSize, Qt
from PySide6.QtWidgets import (
    QDialog,
    QLineEdit,
    QListWidget,
    QListWidgetItem,
    QStyledItemDelegate,
    QVBoxLayout,
)

from fieldview.gui.actions import Actions
from fieldview.gui.theme import ROW

KEYS = Qt.ItemDataRole.UserRole + 1


class _Row(QStyledItemDelegate):
    """Rows of one height, each with its shortcut at the right."""

    def sizeHint(self, option, index):
        return QSize(0, ROW)

    def initStyleOption(self, option, index):
        super().initStyleOption(option, index)
        option.features |= option.ViewItemFeature.HasDecoration  # titles stand in line, with icon or without
        option.decorationSize = QSize(18, 18)

    def paint(self, painter, option, index):
        super().paint(painter, option, index)
        painter.setPen(option.palette.placeholderText().color())
        box = option.rect.adjusted(0, 0, -8, 0)
        painter.drawText(
            box, Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter, index.data(KEYS) or ""
        )


class Finder(QDialog):
    """Type a part of a command's name; Return runs the first, arrow keys choose another."""

    def __init__(self, actions: Actions, parent=None):
        super().__init__(parent)
        self.setObjectName("finder")
        self.setWindowTitle("Find a command")
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.resize(440, 360)
        self._actions = actions
        column = QVBoxLayout(self)
        self.entry = QLineEdit()
        self.entry.setPlaceholderText("Type a part of its name")
        self.entry.setAccessibleName("Name of the command")
        self.entry.textChanged.connect(self._narrow)
        self.entry.returnPressed.connect(self._run)
        self.list = QListWidget()
        self.list.setAccessibleName("Commands found")
        self.list.setIconSize(QSize(18, 18))
        self.list.setItemDelegate(_Row(self.list))
        self.list.itemActivated.connect(lambda _: self._run())
        column.addWidget(self.entry)
        column.addWidget(self.list)
        self._narrow("")

    def _narrow(self, text: str) -> None:
        self.list.clear()
        words = text.lower().split()
        for command in self._actions.commands.values():
            if not command.menu:
                continue
            action = self._actions[command.id]
            title = action.text().replace("&", "")
            if all(word in f"{title} {command.menu} {command.hint}".lower() for word in words):
                item = QListWidgetItem(title)
                item.setData(KEYS, action.shortcut().toString())
                item.setData(Qt.ItemDataRole.UserRole, command.id)
                item.setIcon(action.icon())
                if not action.isEnabled():
                    item.setFlags(Qt.ItemFlag.NoItemFlags)
                self.list.addItem(item)
        usable = [i for i in range(self.list.count()) if self.list.item(i).flags()]
        if usable:
            self.list.setCurrentRow(usable[0])

    def keyPressEvent(self, event):
        if event.key() in (Qt.Key.Key_Up, Qt.Key.Key_Down):
            by = -1 if event.key() == Qt.Key.Key_Up else 1
            self.list.setCurrentRow(min(max(self.list.currentRow() + by, 0), self.list.count() - 1))
        else:
            super().keyPressEvent(event)

    def _run(self) -> None:
        item = self.list.currentItem()
        if item is not None and item.flags() & Qt.ItemFlag.ItemIsEnabled:
            chosen = item.data(Qt.ItemDataRole.UserRole)
            self.accept()
            self._actions.run(chosen)
