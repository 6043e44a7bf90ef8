"""A map of one quantity in a sheet: colours, axes with units, and its range in words."""

from __future__ import annotations

import numpy as np
import pyqtgraph as pg

from fieldview.compute.grid import Grid
from fieldview.gui import theme as themes
from fieldview.gui.panels.plots import Plot
from fieldview.publish import wording
from fieldview.publish.units_shown import UnitView


class MapPlot(Plot):
    """Equal scales on both axes; signed maps are symmetric about zero."""

    def __init__(self, name: str, parent=None):
        super().__init__(name, parent)
        self.getViewBox().setAspectLocked(True)
        self.setMinimumHeight(220)

    def show_map(
        self, grid: Grid, values: np.ndarray, view: UnitView, unit: str, *, signed: bool
    ) -> tuple[float, float] | None:
        """Draw node values (ny, nx); returns the range of the colours, None where there is no value."""
        self.start(view.label("x", unit), view.label("y", unit), zero=False)
        known = values[np.isfinite(values)]
        if not known.size:
            return None
        signed = signed and bool(known.min() < -0.02 * known.max())  # a flow all one way has no two sides
        most = wording.round_up(float(np.percentile(np.abs(known), 99.5)))
        low, high = (-most, most) if signed else (min(0.0, float(known.min())), most)
        table = themes.table_for_range(self.theme, "signed" if signed else "unsigned", low, high)
        self.show_axes(True)
        self.addItem(self._item(grid, values, table, low, high, view.length))
        self.getViewBox().autoRange(padding=0.01)
        return low, high

    def _item(self, grid: Grid, values, table, low: float, high: float, factor: float):
        if all(grid.is_uniform) and grid.placement.is_identity and grid.is_plane:
            image = pg.ImageItem(axisOrder="row-major")
            image.setImage(values, levels=(low, high), lut=table)
            dx, dy = grid.spacing
            x, y = factor * (grid.x[0] - 0.5 * dx), factor * (grid.y[0] - 0.5 * dy)
            image.setRect(x, y, factor * dx * grid.x.size, factor * dy * grid.y.size)
            return image
        nodes = factor * grid.nodes
        share = np.clip((values - low) / (high - low or 1.0), 0, 1)
        brushes = [
            pg.mkBrush(*table[int(255 * part)]) if np.isfinite(part) else pg.mkBrush(None)
            for part in share.ravel()
        ]
        return pg.ScatterPlotItem(
            nodes.real.ravel(), nodes.imag.ravel(), brush=brushes, pen=None, symbol="s", size=8
        )


def range_words(span: tuple[float, float] | None, unit: str) -> str:
    """``colours from −40 to 40 1/s``."""
    if span is None:
        return "no value anywhere"
    low, high = (wording.short(end) for end in span)
    return f"colours from {low} to {high} {wording.unit_text(unit)}".rstrip()
