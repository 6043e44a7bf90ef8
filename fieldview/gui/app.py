"""Opening the window."""

from __future__ import annotations

import sys

from PySide6.QtWidgets import QApplication, QMainWindow

from fieldview.gui.window import MainWindow

TURN = 0.001
"""[s]"""

_application: QApplication | None = None


def create_window(paths=()) -> QMainWindow:
    """The main window with these opened: a session file, or the files or folder of a run.

    A QApplication is made if there is none. The window is not shown and no event loop is started.
    """
    application()
    window = MainWindow()
    if paths:
        window.open([paths] if isinstance(paths, str) else list(paths))
    return window


def application() -> QApplication:
    """The running application, made on first use and kept."""
    global _application
    running = QApplication.instance()
    # background work holds the interpreter for at most so long before the window gets its turn
    sys.setswitchinterval(TURN)
    if running is None:
        running = _application = QApplication(sys.argv[:1])
        running.setApplicationName("Loopflux")
        running.setStyle("Fusion")
    return running


def run(paths=()) -> int:
    """Open the window and serve it until it is closed; returns the exit status."""
    window = create_window(paths)
    window.show()
    return application().exec()
