"""The window's own drawings, in the theme's colours."""

from __future__ import annotations

import sys
import sysconfig
from functools import lru_cache
from pathlib import Path

from PySide6.QtCore import QByteArray, QRectF, Qt
from PySide6.QtGui import QIcon, QPainter, QPixmap

import fieldview
from fieldview.gui.theme import Theme

_SIZES = (16, 20, 24, 32, 48)


def icon_folder() -> Path:
    """Where the drawings lie: beside the package in a checkout, under share/loopflux once installed."""
    beside = Path(fieldview.__file__).resolve().parent.parent / "icons"
    installed = [
        Path(root) / "share" / "loopflux" / "icons" for root in (sysconfig.get_path("data"), sys.prefix)
    ]
    return next((folder for folder in (beside, *installed) if (folder / "move.svg").is_file()), beside)


@lru_cache(maxsize=256)
def icon(name: str, theme: Theme) -> QIcon:
    """The drawing ``name``.svg as an icon: text colour, reversed where checked, muted where disabled."""
    made = QIcon()
    for mode, state, colour in (
        (QIcon.Mode.Normal, QIcon.State.Off, theme.text),
        (QIcon.Mode.Normal, QIcon.State.On, theme.on_accent),
        (QIcon.Mode.Active, QIcon.State.On, theme.on_accent),
        (QIcon.Mode.Disabled, QIcon.State.Off, theme.muted),
        (QIcon.Mode.Disabled, QIcon.State.On, theme.muted),
    ):
        for size in _SIZES:
            made.addPixmap(drawing(name, colour, size), mode, state)
    return made


def drawing(name: str, colour: str, size: int) -> QPixmap:
    """One drawing in one colour and size; an empty one where the file is missing."""
    from PySide6.QtSvg import QSvgRenderer

    pixmap = QPixmap(size, size)
    pixmap.fill(Qt.GlobalColor.transparent)
    path = icon_folder() / f"{name}.svg"
    if path.is_file():
        text = path.read_text(encoding="utf-8").replace("currentColor", colour)
        painter = QPainter(pixmap)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        QSvgRenderer(QByteArray(text.encode())).render(painter, QRectF(0, 0, size, size))
        painter.end()
    return pixmap
