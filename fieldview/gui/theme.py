"""Every colour, size and font of the window."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtGui import QColor, QFont, QGuiApplication, QPalette

from fieldview.publish.looks import REGION_COLOURS, REGION_DASHES, diverging, luminance

FONT_PIXELS = 13
SMALL_PIXELS = 11
ROW = 24
GRID = 4


@dataclass(frozen=True)
class Theme:
    """One set of colours. ``ink`` is what lies on the map: arrows, labels, node marks."""

    name: str
    canvas: str
    panel: str
    text: str
    muted: str
    accent: str
    on_accent: str
    attention: str
    filled: str
    hairline: str
    chosen: str
    entry: str
    signed_map: tuple[str, str, str]
    unsigned_map: str
    unsigned_part: tuple[float, float]
    cyclic_map: str = "CET-CBC1"

    @property
    def ink(self) -> str:
        return self.text

    @property
    def dark(self) -> bool:
        return self.name == "dark"


LIGHT = Theme(
    name="light",
    canvas="#ffffff",
    panel="#f4f6f8",
    text="#1b2a41",
    muted="#55647a",
    accent="#0b6e69",
    on_accent="#ffffff",
    attention="#a34a17",
    filled="#5f3f9b",
    hairline="#d5dbe2",
    chosen="#dcefed",
    entry="#ffffff",
    signed_map=("#1f5a96", "#f7f5f1", "#9c4613"),
    unsigned_map="CET-L12",
    unsigned_part=(0.0, 1.0),
)
DARK = Theme(
    name="dark",
    canvas="#10161f",
    panel="#18212d",
    text="#e6ebf2",
    muted="#9aa8ba",
    accent="#4fc3bd",
    on_accent="#10161f",
    attention="#e39a63",
    filled="#b9a6e6",
    hairline="#2e3a4a",
    chosen="#1f3b41",
    entry="#10161f",
    signed_map=("#5b9be0", "#161c26", "#e0793a"),
    unsigned_map="CET-CBL1",
    unsigned_part=(0.04, 0.6),
)


def of_desktop() -> Theme:
    """The theme that the desktop asks for."""
    dark = QGuiApplication.styleHints().colorScheme() == Qt.ColorScheme.Dark
    return DARK if dark else LIGHT


def font(*, pixels: int = FONT_PIXELS, bold: bool = False) -> QFont:
    """The desktop's own font at this size, its digits all equally wide."""
    made = QFont(QGuiApplication.font())
    made.setPixelSize(pixels)
    made.setBold(bold)
    made.setFeature(QFont.Tag("tnum"), 1)
    return made


@lru_cache(maxsize=16)
def colour_table(theme: Theme, kind: str) -> np.ndarray:
    """256 colours of a map: uint8 ndarray (256, 3); kind is "signed", "unsigned" or "cyclic"."""
    import pyqtgraph as pg

    if kind == "signed":
        return diverging(*theme.signed_map)
    name = {"unsigned": theme.unsigned_map, "cyclic": theme.cyclic_map}[kind]
    low, high = theme.unsigned_part if kind == "unsigned" else (0.0, 1.0)
    return pg.colormap.get(name).getLookupTable(start=low, stop=high, nPts=256)[:, :3].astype(np.uint8)


def table_for_range(theme: Theme, kind: str, low: float, high: float) -> np.ndarray:
    """The colours for a range: the two colours of the signs only where zero is in its middle."""
    even = kind != "signed" or abs(low + high) <= 1e-6 * (high - low)
    return colour_table(theme, kind if even else "unsigned")


def contrast(one: str, other: str) -> float:
    """Contrast ratio of two colours, 1 to 21 (relative luminance as in WCAG 2.1)."""
    bright, dim = sorted((luminance(one), luminance(other)), reverse=True)
    return (bright + 0.05) / (dim + 0.05)


@lru_cache(maxsize=256)
def legible(colour: str, theme: Theme, ground: str | None = None) -> str:
    """The colour, drawn towards the text's colour until it reads on the ground (contrast of 4.5 or more)."""
    ground = ground or theme.canvas
    start, end = QColor(colour), QColor(theme.text)
    for step in range(21):
        share = step / 20
        mixed = QColor.fromRgbF(
            *(
                (1 - share) * a + share * b
                for a, b in zip(start.getRgbF()[:3], end.getRgbF()[:3], strict=True)
            )
        )
        if contrast(mixed.name(), ground) >= 4.5:
            return mixed.name()
    return theme.text


def region_colour(colour: str | None, place: int) -> str:
    """A region's own colour, or the one of its place in the list."""
    if colour and QColor(colour).isValid():
        return QColor(colour).name()
    return REGION_COLOURS[place % len(REGION_COLOURS)]


def region_dash(place: int) -> tuple[float, ...]:
    return REGION_DASHES[place % len(REGION_DASHES)]


def palette(theme: Theme) -> QPalette:
    made = QPalette()
    roles = QPalette.ColorRole
    for role, colour in {
        roles.Window: theme.panel,
        roles.WindowText: theme.text,
        roles.Base: theme.entry,
        roles.AlternateBase: theme.panel,
        roles.Text: theme.text,
        roles.Button: theme.panel,
        roles.ButtonText: theme.text,
        roles.BrightText: theme.attention,
        roles.Highlight: theme.accent,
        roles.HighlightedText: theme.on_accent,
        roles.ToolTipBase: theme.panel,
        roles.ToolTipText: theme.text,
        roles.PlaceholderText: theme.muted,
        roles.Link: theme.accent,
        roles.Mid: theme.hairline,
        roles.Light: theme.hairline,
        roles.Dark: theme.hairline,
    }.items():
        made.setColor(role, QColor(colour))
    for role in (roles.WindowText, roles.Text, roles.ButtonText):
        made.setColor(QPalette.ColorGroup.Disabled, role, QColor(theme.muted))
    return made
