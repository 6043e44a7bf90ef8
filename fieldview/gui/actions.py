"""Every command of the window as a table: id, title, menu, shortcut, icon, when it is enabled, what it does.

Tests, menus, the tool bar and the command finder all work from this one table.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from PySide6.QtCore import Qt
from PySide6.QtGui import QAction, QKeySequence
from PySide6.QtWidgets import QMenu, QWidget

from fieldview.gui.picture import Picture

MENUS = ("Run", "Edit", "View", "Measure", "Output", "Help")


def always(picture: Picture) -> bool:
    return True


def has_session(picture: Picture) -> bool:
    return picture.session is not None


def has_field(picture: Picture) -> bool:
    return picture.field is not None


def has_frames(picture: Picture) -> bool:
    return picture.run is not None and picture.run.frames > 1


def has_selection(picture: Picture) -> bool:
    return picture.selected is not None


@dataclass(frozen=True)
class Command:
    """One command. ``run`` gets the window; what changes the session goes through its desk.

    Attributes
    ----------
    id : str
        Stable; the action's object name.
    enabled, checked, text : functions of the picture
        ``checked`` makes the action checkable; ``text`` gives a title that changes, as for Undo.
    menu : str
        One of `MENUS`, or "" for what only a banner offers.
    scope : "window" or "canvas"
        Where the shortcut works; "canvas" leaves arrow keys to tables and entries.
    group : str
        Sub-menu, or "" for none.
    """

    id: str
    title: str
    menu: str
    run: Callable
    shortcut: str = ""
    icon: str = ""
    enabled: Callable[[Picture], bool] = always
    checked: Callable[[Picture], bool] | None = None
    text: Callable[[Picture], str] | None = None
    scope: str = "window"
    group: str = ""
    separated: bool = False
    hint: str = ""


class Actions:
    """The table made into actions of a window, kept in step with the picture."""

    def __init__(self, window: QWidget, commands: tuple[Command, ...]):
        self.commands = {command.id: command for command in commands}
        self._actions = {command.id: self._made(window, command) for command in commands}
        self._menus: dict[tuple[str, str], QMenu] = {}

    def _made(self, window: QWidget, command: Command) -> QAction:
        action = _action(window, command)

        def run(_=False) -> None:
            command.run(window)
            if command.checked is not None:
                # Qt has already turned the mark; what it shows is the picture's to say
                action.setChecked(command.checked(window.desk.picture))

        action.triggered.connect(run)
        return action

    def __getitem__(self, id: str) -> QAction:
        return self._actions[id]

    def items(self):
        """Pairs of id and action."""
        return self._actions.items()

    def run(self, id: str) -> None:
        self._actions[id].trigger()

    def fill(self, menu_bar) -> None:
        """Put every action into its menu, in the table's order."""
        menus = {name: menu_bar.addMenu(f"&{name}") for name in MENUS}
        for command in self.commands.values():
            if not command.menu:
                continue
            menu = menus[command.menu]
            if command.group:
                key = (command.menu, command.group)
                if key not in self._menus:
                    self._menus[key] = menu.addMenu(command.group)
                menu = self._menus[key]
            if command.separated:
                menu.addSeparator()
            menu.addAction(self._actions[command.id])

    def bind(self, scope: str, *widgets: QWidget) -> None:
        """Let the shortcuts of a scope work in these widgets."""
        for command in self.commands.values():
            if command.scope == scope:
                for widget in widgets:
                    widget.addAction(self._actions[command.id])

    def draw(self, picture: Picture) -> None:
        for command in self.commands.values():
            action = self._actions[command.id]
            action.setEnabled(command.enabled(picture))
            if command.checked is not None:
                action.setChecked(command.checked(picture))
            if command.text is not None:
                action.setText(command.text(picture))

    def dress(self, icon_of) -> None:
        """Give the actions their icons; ``icon_of(name)`` makes one in the theme's colours."""
        for command in self.commands.values():
            if command.icon:
                self._actions[command.id].setIcon(icon_of(command.icon))


def _action(window: QWidget, command: Command) -> QAction:
    """The action of a command, not yet connected."""
    action = QAction(command.title, window)
    action.setObjectName(command.id)
    if command.shortcut:
        action.setShortcuts([QKeySequence(keys) for keys in command.shortcut.split(" | ")])
    if command.scope == "canvas":
        action.setShortcutContext(Qt.ShortcutContext.WidgetWithChildrenShortcut)
    action.setCheckable(command.checked is not None)
    plain = command.title.replace("&", "").removesuffix(" …")
    keys = f" ({command.shortcut.split(' | ')[0]})" if command.shortcut else ""
    action.setToolTip(f"{plain}{keys}" + (f"\n{command.hint}" if command.hint else ""))
    action.setStatusTip(command.hint)
    return action
