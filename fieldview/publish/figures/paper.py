"""Sizes on paper: text, lines and margins in millimetres, whatever the figure shows."""

from __future__ import annotations

from contextlib import contextmanager
from dataclasses import dataclass

from fieldview.publish.looks import INK, MUTED
from fieldview.session.figures import FigureSettings

INCH = 25.4
POINT = INCH / 72
"""[mm]"""


@dataclass(frozen=True)
class Paper:
    """How large things are. All lengths in millimetres."""

    settings: FigureSettings

    @property
    def em(self) -> float:
        return self.settings.font_pt * POINT

    @property
    def width(self) -> float:
        return self.settings.width_mm

    def line(self, share: float = 1.0) -> float:
        """Width of a line in points, in proportion to the text."""
        return share * self.settings.font_pt / 10


def plain(text: str) -> str:
    """Text of the user's, in which a dollar sign is a dollar sign and begins no formula."""
    return text.replace("$", r"\$")


@contextmanager
def style(settings: FigureSettings):
    """The rules of matplotlib under which a figure is made and written."""
    import matplotlib

    size = settings.font_pt
    rules = {
        "font.family": "DejaVu Sans",
        "font.size": size,
        "axes.titlesize": size,
        "axes.labelsize": size,
        "xtick.labelsize": 0.9 * size,
        "ytick.labelsize": 0.9 * size,
        "legend.fontsize": 0.9 * size,
        "text.color": INK,
        "axes.edgecolor": MUTED,
        "axes.labelcolor": INK,
        "xtick.color": INK,
        "ytick.color": INK,
        "axes.linewidth": size / 16,
        "xtick.major.width": size / 16,
        "ytick.major.width": size / 16,
        "xtick.major.size": size / 3.2,
        "ytick.major.size": size / 3.2,
        "lines.linewidth": size / 8,
        "hatch.linewidth": size / 20,
        "axes.unicode_minus": True,
        # type 42 fonts are embedded whole and can be read by every program that edits the figure
        "pdf.fonttype": 42,
        "svg.fonttype": "path",
        "svg.hashsalt": "loopflux",
        "path.simplify": True,
    }
    with matplotlib.rc_context(rules):
        yield
