"""Pictures of the window's main states from the sample sessions.

    python tests/screenshots.py DIR [--scale 2]

writes 1280×720 and 1920×1080, light and dark, without needing a display.
"""

from __future__ import annotations

import argparse
import os
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
SIZES = ((1280, 720), (1920, 1080))


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", type=Path, help="where the pictures go")
    parser.add_argument("--scale", type=float, default=1.0, help="2 draws as on a screen at 200 %%")
    chosen = parser.parse_args()
    os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
    os.environ["QT_SCALE_FACTOR"] = str(chosen.scale)
    chosen.folder.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory() as home:
        for name in ("CONFIG", "STATE", "DATA"):
            os.environ[f"XDG_{name}_HOME"] = home
        take_all(chosen.folder)
    return 0


def take_all(folder: Path) -> None:
    from fieldview.gui import theme
    from fieldview.gui.app import create_window

    for size in SIZES:
        for look in (theme.LIGHT, theme.DARK):
            stem = f"{size[0]}x{size[1]}_{look.name}"
            window = create_window()
            window.set_theme(look)
            window.resize(*size)
            window.show()
            take(window, folder / f"start_{stem}.png")
            for session in sorted((ROOT / "sample_sessions").rglob("*.session.json")):
                window.open([session])
                for state, change in STATES.items():
                    change(window)
                    take(window, folder / f"{session.name.split('.')[0]}_{state}_{stem}.png")
                if session.name.startswith("fin_wake"):
                    take_sheets(window, folder, stem)
            window.desk.update(saved=window.session)
            window.close()
            window.deleteLater()


SHEETS = (
    "study.check",
    "study.over_time",
    "study.statistics",
    "study.correlation",
    "study.phase",
    "study.modes",
    "study.compare",
    "study.choices",
    "study.repeats",
    "output.figure",
    "sheet.uncertainty",
    "sheet.calibration",
)


def take_sheets(window, folder: Path, stem: str) -> None:
    """The sheets, each with what comes of its Start."""
    from PySide6.QtGui import QAction
    from PySide6.QtWidgets import QApplication

    from fieldview.gui.sheets import Sheet

    for id in SHEETS:
        window.findChild(QAction, id).trigger()
        sheet = next(sheet for sheet in window.findChildren(Sheet) if sheet.isVisible())
        if hasattr(sheet, "begin") and id != "output.figure":
            sheet.begin.click()
        preview = getattr(sheet, "preview", None)
        until = time.monotonic() + 20
        while preview is not None and preview.pixmap().isNull() and time.monotonic() < until:
            QApplication.processEvents()
        take(window, folder / f"{id.replace('.', '_')}_{stem}.png", shown=sheet)
        sheet.close()


def take(window, path: Path, shown=None) -> None:
    """Wait until everything is drawn, then take the picture."""
    from PySide6.QtWidgets import QApplication

    until = time.monotonic() + 60
    QApplication.processEvents()
    while not window.idle and time.monotonic() < until:
        QApplication.processEvents()
        time.sleep(0.005)
    QApplication.processEvents()
    (shown or window).grab().save(str(path))
    print(path)


def plain(window) -> None:
    names = [r.name for r in window.session.regions]
    window.desk.show(selected=names[0] if names else None, line=None, drawer="growth", iso_lines=None)


def ledger(window) -> None:
    lines = len(window.session.ledger)
    window.desk.show(line=min(2, lines - 1) if lines else None, drawer="budget", quantity="speed")


def followed(window) -> None:
    window.desk.show(drawer="over_time", line=None, quantity="vorticity", iso_lines="speed")
    window.desk.follow()


STATES = {"plain": plain, "ledger": ledger, "followed": followed}

if __name__ == "__main__":
    sys.path.insert(0, str(ROOT))
    sys.exit(main())
