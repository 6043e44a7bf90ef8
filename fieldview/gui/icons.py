"""The window's own drawings, in the theme's colours."""

from __future__ import annotations

from functools import lru_cache

from PySide6.QtCore import QByteArray, QRectF, Qt
from PySide6.QtGui import QIcon, QPainter, QPixmap

from fieldview.gui.theme import Theme
from fieldview.shipped import shipped_folder

_SIZES = (16, 20, 24, 32, 48)


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


@lru_cache(maxsize=1024)
def drawing(name: str, colour: str, size: int) -> QPixmap:
    """One drawing in one colour and size; an empty one where the file is missing."""
    from PySide6.QtSvg import QSvgRenderer

    pixmap = QPixmap(size, size)
    pixmap.fill(Qt.GlobalColor.transparent)
    text = _text_of(name)
    if text:
        text = text.replace("currentColor", colour)
        painter = QPainter(pixmap)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        QSvgRenderer(QByteArray(text.encode())).render(painter, QRectF(0, 0, size, size))
        painter.end()
    return pixmap


@lru_cache(maxsize=128)
def _text_of(name: str) -> str:
    """The drawing as it is on disk; nothing where it is missing."""
    path = shipped_folder("icons") / f"{name}.svg"
    return path.read_text(encoding="utf-8") if path.is_file() else ""
