"""A small plot in the window's colours: lines with bands, markers, and labelled axes."""

from __future__ import annotations

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import Qt
from PySide6.QtGui import QColor

from fieldview.gui import theme as themes
from fieldview.gui.theme import LIGHT, Theme


class Plot(pg.PlotWidget):
    """Draws what it is given whole; there is nothing to interact with but reading."""

    def __init__(self, name: str, parent=None):
        super().__init__(parent, enableMenu=False)
        self.setObjectName(name)
        self.setAccessibleName(name.replace("_", " "))
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        item = self.getPlotItem()
        # the plot's own menu is never shown, yet made: as a child it goes when the plot goes
        item.ctrlMenu.setParent(self, item.ctrlMenu.windowFlags())
        item.hideButtons()
        item.setMouseEnabled(False, False)
        self.theme: Theme = LIGHT

    def set_theme(self, theme: Theme) -> None:
        self.theme = theme
        self.setBackground(QColor(theme.canvas))
        for name in ("left", "bottom"):
            axis = self.getAxis(name)
            axis.enableAutoSIPrefix(False)
            axis.setPen(QColor(theme.muted))
            axis.setTextPen(QColor(theme.muted))
            axis.setStyle(tickFont=themes.font(pixels=themes.SMALL_PIXELS), tickLength=-4, maxTickLevel=0)

    def start(self, x_label: str, y_label: str, *, zero: bool = True) -> None:
        """An empty plot with these axes; ``zero`` draws the zero line and keeps it in sight."""
        self.clear()
        style = {"color": self.theme.muted, "font-size": f"{themes.SMALL_PIXELS}px"}
        self.setLabel("bottom", x_label, **style)
        self.setLabel("left", y_label, **style)
        self.show_axes(False)
        if zero:
            self.addItem(pg.InfiniteLine(0, 0, pen=pg.mkPen(self.theme.hairline, width=1)))

    def show_axes(self, on: bool) -> None:
        """An empty plot needs no axes with made-up numbers."""
        for name in ("left", "bottom"):
            self.getPlotItem().showAxis(name, on)

    def add_line(self, x, y, colour: str, *, spread=None, dash: tuple[float, ...] = (), width=1.6) -> None:
        """A curve, with a band of ± ``spread`` where that is known."""
        self.show_axes(True)
        x, y = np.asarray(x, float), np.asarray(y, float)
        colour = themes.legible(colour, self.theme)
        if spread is not None and np.isfinite(spread).any():
            band = QColor(colour)
            band.setAlphaF(0.22)
            # a data item without a pen has no path, and its band would be nothing
            spread = np.asarray(spread, float)
            edges = [pg.PlotCurveItem(x, y + sign * spread, connect="finite") for sign in (1, -1)]
            self.addItem(pg.FillBetweenItem(*edges, brush=band))
        pen = pg.mkPen(colour, width=width)
        if dash:
            pen.setDashPattern(dash)
        self.addItem(pg.PlotDataItem(x, y, pen=pen, connect="finite"))

    def add_mark(self, x: float, text: str) -> None:
        """A dashed upright line with a word."""
        line = pg.InfiniteLine(
            x,
            90,
            pen=pg.mkPen(self.theme.muted, width=1, style=Qt.PenStyle.DashLine),
            label=text,
            labelOpts={"position": 0.5, "color": self.theme.muted, "anchors": [(0, 0.5), (0, 0.5)]},
        )
        line.label.setFont(themes.font(pixels=themes.SMALL_PIXELS))
        self.addItem(line, ignoreBounds=True)
