"""A small run on disk, a window on it, and a check that no test leaves anything behind."""

import gc
import os
import shutil
import threading

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import numpy as np
import pytest
from PySide6.QtCore import QCoreApplication, QEvent, QPoint, Qt, QTimer
from PySide6.QtGui import QAction
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from fieldview.files.reading import Reading
from fieldview.gui.app import create_window
from fieldview.session.models import RunSource, Session, Uncertainties
from fieldview.session.regions import Circle
from fieldview.session.steps import Fill, MedianTest
from fieldview.session.store import save_session

NX, NY, SPACING, FRAMES = 41, 31, 0.002, 4


def vortex_frame(frame: int, *, outlier: bool = True) -> np.ndarray:
    """Rows x, y, u, v of a drifting Lamb-Oseen vortex with noise, one outlier and one missing vector."""
    x, y = np.meshgrid(np.arange(NX) * SPACING, np.arange(NY) * SPACING)
    dx, dy = x - 0.04 - 0.002 * frame, y - 0.03
    r2 = dx**2 + dy**2 + 1e-12
    turn = 0.01 / (2 * np.pi * r2) * (1 - np.exp(-r2 / 0.008**2))
    noise = np.random.default_rng(frame).normal(0, 0.002, (2, NY, NX))
    u, v = 0.1 - turn * dy + noise[0], turn * dx + noise[1]
    if outlier:
        u[5, 7] += 2.0
        u[20, 30] = v[20, 30] = np.nan
    return np.column_stack([a.ravel() for a in (x, y, u, v)])


def write_frame(path, rows) -> None:
    lines = ["x [m],y [m],u [m/s],v [m/s]"]
    lines += [",".join("" if np.isnan(value) else repr(float(value)) for value in row) for row in rows]
    path.write_text("\n".join(lines) + "\n")


@pytest.fixture(autouse=True)
def own_places(tmp_path, monkeypatch):
    """What the window remembers goes to a folder of the test."""
    for name in ("CONFIG", "STATE", "DATA", "CACHE"):
        monkeypatch.setenv(f"XDG_{name}_HOME", str(tmp_path / "home" / name.lower()))


@pytest.fixture(autouse=True)
def no_rest(monkeypatch):
    """What gives way to the painting of a frame need not wait in a test."""
    from fieldview.gui import pursuit

    monkeypatch.setattr(pursuit, "REST_MS", 0)


@pytest.fixture(scope="session")
def frames_on_disk(tmp_path_factory):
    folder = tmp_path_factory.mktemp("frames")
    for frame in range(FRAMES):
        write_frame(folder / f"f{frame}.csv", vortex_frame(frame))
    return folder


@pytest.fixture
def run_folder(tmp_path, frames_on_disk):
    return shutil.copytree(frames_on_disk, tmp_path / "run")


@pytest.fixture
def session_file(run_folder):
    """A session on the run: median test, fill, one circle round the vortex, a stated error model."""
    session = Session(
        title="drifting vortex",
        units="m, s",
        run=RunSource(files=("run/f*.csv",), reading=Reading(y_axis="up", v_positive="up")),
        error_model=Uncertainties(sigma=0.002, correlation_nodes=1.0),
        ledger=(MedianTest(floor=0.01), Fill()),
        regions=(Circle(name="core", centre=(0.04, 0.03), radius=0.015),),
    )
    path = run_folder.parent / "vortex.session.json"
    save_session(session.in_folder(run_folder.parent), path)
    return path


def settle(qtbot, window) -> None:
    """Wait until the window has nothing left to do."""
    qtbot.waitUntil(lambda: window.idle, timeout=20_000)
    QApplication.processEvents()


@pytest.fixture
def open_window(qtbot):
    """A function that opens a shown, idle window; every one is closed at the end."""
    windows = []

    def opened(*paths, idle=True):
        window = create_window(paths)
        windows.append(window)
        window.resize(1280, 720)
        window.show()
        qtbot.waitExposed(window)
        window.activateWindow()
        window.canvas.setFocus()
        if idle:
            settle(qtbot, window)
        return window

    yield opened
    for window in windows:
        put_away(window)


@pytest.fixture
def window(open_window, session_file):
    return open_window(session_file)


def put_away(window) -> None:
    window.desk.update(saved=window.session)  # so that closing does not ask
    window.close()
    window.deleteLater()
    sweep()


def sweep() -> None:
    """Let everything that was marked for deletion go."""
    for _ in range(2):
        QCoreApplication.sendPostedEvents(None, QEvent.Type.DeferredDelete)
        QApplication.processEvents()


@pytest.fixture(autouse=True)
def nothing_left(qapp):
    """No test may leave a widget or a thread of ours behind."""
    widgets_before = set(map(id, QApplication.topLevelWidgets()))
    yield
    sweep()
    left = [w for w in QApplication.topLevelWidgets() if id(w) not in widgets_before]
    assert not left, f"widgets left behind: {left}"
    threads = [t.name for t in threading.enumerate() if t.name.startswith("loopflux")]
    assert not threads, f"threads left behind: {threads}"


@pytest.fixture(autouse=True, scope="module")
def no_timer_left(qapp):
    """No file of tests may leave a timer running (asked once a file: the search is slow)."""
    yield
    gc.collect()
    timers = [o for o in gc.get_objects() if type(o) is QTimer and is_running(o)]
    assert not timers, f"timers left running: {timers}"


def is_running(timer: QTimer) -> bool:
    try:
        return timer.isActive()
    except RuntimeError:  # already deleted on the other side
        return False


def action(window, id: str) -> QAction:
    found = window.findChild(QAction, id)
    assert found is not None, id
    return found


def pixel(window, x: float, y: float) -> QPoint:
    return window.canvas.to_widget(x, y).toPoint()


def click(window, x: float, y: float, *, modifiers=Qt.KeyboardModifier.NoModifier) -> None:
    QTest.mouseClick(window.canvas.viewport(), Qt.MouseButton.LeftButton, modifiers, pixel(window, x, y))


def drag(window, start, end, *, steps=4, release=True, modifiers=Qt.KeyboardModifier.NoModifier) -> None:
    """Press at a place of the plane, move in steps, release."""
    viewport, left = window.canvas.viewport(), Qt.MouseButton.LeftButton
    QTest.mousePress(viewport, left, modifiers, pixel(window, *start))
    for step in range(1, steps + 1):
        at = [a + (b - a) * step / steps for a, b in zip(start, end, strict=True)]
        move(window, *at, modifiers=modifiers)
    if release:
        QTest.mouseRelease(viewport, left, modifiers, pixel(window, *end))


def move(window, x: float, y: float, *, held=True, modifiers=Qt.KeyboardModifier.NoModifier) -> None:
    """Move the pointer, the left button held or not (QTest's own move cannot hold a button)."""
    from PySide6.QtCore import QPointF
    from PySide6.QtGui import QMouseEvent

    viewport = window.canvas.viewport()
    at = QPointF(pixel(window, x, y))
    buttons = Qt.MouseButton.LeftButton if held else Qt.MouseButton.NoButton
    event = QMouseEvent(
        QEvent.Type.MouseMove,
        at,
        QPointF(viewport.mapToGlobal(at)),
        Qt.MouseButton.NoButton,
        buttons,
        modifiers,
    )
    QApplication.sendEvent(viewport, event)


def key(window, key, modifiers=Qt.KeyboardModifier.NoModifier) -> None:
    QTest.keyClick(window.canvas, key, modifiers)


def near(window, places, expected, *, pixels: float = 1.5) -> bool:
    """Whether places of the plane agree with expected ones to the screen's accuracy."""
    tolerance = pixels / window.canvas.lens().scale
    return np.allclose(np.array(places), np.array(expected), atol=tolerance, rtol=0)
