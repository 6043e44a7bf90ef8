"""The table of commands: unique, reachable, named."""

from collections import Counter

from PySide6.QtCore import Qt
from PySide6.QtGui import QAction, QKeySequence
from PySide6.QtTest import QTest
from PySide6.QtWidgets import (
    QAbstractButton,
    QAbstractItemView,
    QComboBox,
    QLineEdit,
    QToolButton,
    QWidget,
)

from fieldview.gui.commands import all_commands
from fieldview.gui.finder import Finder
from fieldview.gui.tools import TOOLS
from tests.gui.conftest import action, key, settle


def test_ids_and_shortcuts_are_unique():
    commands = all_commands()
    assert all(n == 1 for n in Counter(c.id for c in commands).values())
    keys = [QKeySequence(part).toString() for c in commands if c.shortcut for part in c.shortcut.split(" | ")]
    assert [k for k, n in Counter(keys).items() if n > 1] == []


def test_every_command_is_an_action_and_stands_in_a_menu(window):
    in_menus = set()

    def walk(menu):
        for entry in menu.actions():
            if entry.menu():
                walk(entry.menu())
            elif not entry.isSeparator():
                in_menus.add(entry.objectName())

    for entry in window.menuBar().actions():
        walk(entry.menu())
    for command in all_commands():
        assert window.findChild(QAction, command.id) is not None
        assert not command.menu or command.id in in_menus


def test_a_letter_takes_each_tool_in_hand(window):
    for tool in (*TOOLS, TOOLS[0], TOOLS[0]):
        key(window, getattr(Qt.Key, f"Key_{tool.key}"))
        assert window.desk.picture.shown.tool == tool.id
        assert action(window, f"tool.{tool.id}").isChecked()


def test_digits_choose_the_first_maps(window, qtbot):
    for pressed, name in (("3", "divergence"), ("1", "speed"), ("2", "vorticity")):
        key(window, getattr(Qt.Key, f"Key_{pressed}"))
        assert window.desk.picture.shown.quantity == name
    settle(qtbot, window)


def test_undo_and_redo_by_keyboard(window):
    window.ledger.lines[0].switch.click()
    edited = window.session
    key(window, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    assert window.session.ledger[0].on
    key(window, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.ShiftModifier)
    assert window.session == edited


def test_typing_in_an_entry_does_not_take_a_tool_in_hand(window):
    QTest.mouseClick(window.ledger.lines[0], Qt.MouseButton.LeftButton)
    entry = window.ledger.lines[0].form.findChild(QLineEdit, "form.floor")
    entry.setFocus()
    QTest.keyClicks(entry, "c")
    assert window.desk.picture.shown.tool == "move"


def test_commands_are_found_by_name_and_run(window, qtbot):
    key(window, Qt.Key.Key_K, Qt.KeyboardModifier.ControlModifier)
    finder = window.findChild(Finder)
    QTest.keyClicks(finder.entry, "diverg")
    assert finder.list.count() >= 1
    QTest.keyClick(finder.entry, Qt.Key.Key_Return)
    settle(qtbot, window)
    assert window.desk.picture.map.name == "divergence"


def test_every_control_is_reachable_by_keyboard_and_has_a_name(window):
    window.desk.show(line=0)
    kinds = (QAbstractButton, QComboBox, QLineEdit, QAbstractItemView)
    for widget in window.findChildren(QWidget):
        if not isinstance(widget, kinds) or not widget.isVisible() or inside_another(widget):
            continue
        text = widget.text() if isinstance(widget, QAbstractButton) else ""
        assert widget.accessibleName() or text or widget.toolTip(), widget
        assert widget.focusPolicy() & Qt.FocusPolicy.TabFocus, widget
    for name in ("canvas", "ledger", "quantities", "readout", "regions", "time_strip"):
        assert window.findChild(QWidget, name).accessibleName()


def inside_another(widget) -> bool:
    """Parts that Qt builds into its own controls, and what only repeats a menu."""
    owner = widget.parent()
    return (
        isinstance(owner, QComboBox | QAbstractItemView)
        or widget.objectName().startswith("qt_")
        or (isinstance(owner, QWidget) and isinstance(owner.parent(), QComboBox))
        or (isinstance(widget, QToolButton) and widget.objectName() == "qt_toolbar_ext_button")
    )


def shortcuts():
    return [(c.id, keys) for c in all_commands() if c.shortcut for keys in c.shortcut.split(" | ")]


def test_every_shortcut_reaches_its_command(window, qtbot, monkeypatch):
    """Real key events; the commands themselves are tested elsewhere and only counted here."""
    window.desk.show(selected="core", frame=1)
    settle(qtbot, window)
    action(window, "region.duplicate").trigger()
    window.desk.show(selected="core")
    action(window, "region.duplicate").trigger()
    window.desk.undo()  # something to undo, something to redo
    window.desk.show(selected="core")
    settle(qtbot, window)
    for id, keys in shortcuts():
        command = window.actions_table.commands[id]
        counted = []
        act = action(window, id)
        assert act.isEnabled(), id
        act.triggered.disconnect()
        act.triggered.connect(lambda *_, id=id, counted=counted: counted.append(id))
        window.canvas.setFocus()
        combination = QKeySequence(keys)[0]
        QTest.keyClick(window.canvas, combination.key(), combination.keyboardModifiers())
        assert counted == [id], f"{keys} for {command.title}"
