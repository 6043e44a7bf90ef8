"""Finding commands, help on the panels, and what this program is."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QApplication, QDialog, QTextBrowser, QVBoxLayout, QWidget

from fieldview.gui.actions import Command
from fieldview.gui.help_pages import PAGES


def help_commands() -> tuple[Command, ...]:
    return (
        Command("help.find", "Find a command …", "Help", lambda w: w.find_command(), "Ctrl+K", "search"),
        Command("help.page", "Help on this panel", "Help", show_help, "F1"),
        Command("help.about", "About Loopflux", "Help", about, separated=True),
    )


def show_help(window) -> None:
    """The page of the panel that has the focus."""
    HelpPage(window, topic_of(QApplication.focusWidget())).show()


def topic_of(widget: QWidget | None) -> str:
    """The help topic of a widget: that of the nearest part of the window that has one."""
    while widget is not None:
        if widget.objectName() in PAGES:
            return widget.objectName()
        widget = widget.parentWidget()
    return "canvas"


class HelpPage(QDialog):
    """One page of help: what the panel shows, with its formulas and where they come from."""

    def __init__(self, window, topic: str):
        super().__init__(window)
        self.setObjectName("help_page")
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        title, body = PAGES[topic]
        self.setWindowTitle(f"Help: {title}")
        self.resize(560, 520)
        column = QVBoxLayout(self)
        self.text = QTextBrowser()
        self.text.setAccessibleName(f"Help on {title}")
        self.text.setOpenExternalLinks(False)
        theme = window.theme
        self.text.document().setDefaultStyleSheet(
            f"h2 {{ color: {theme.accent}; }} td {{ padding-right: 12px; }} "
            f".source {{ color: {theme.muted}; }}"
        )
        self.text.setHtml(f"<h2>{title}</h2>{body}")
        column.addWidget(self.text)


def about(window) -> None:
    """Versions of the program and of the libraries its numbers come from."""
    from importlib.metadata import version

    import fieldview

    libraries = ("numpy", "scipy", "shapely", "contourpy", "PySide6-Essentials", "pyqtgraph")
    versions = ", ".join(f"{name} {version(name)}" for name in libraries)
    window.desk.tell(
        f"Loopflux {fieldview.__version__}: circulation, flux and their uncertainty from measured velocity "
        f"fields. Computed with {versions}. BSD 3-Clause licence."
    )
