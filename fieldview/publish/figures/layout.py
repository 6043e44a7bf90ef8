"""Where the panels, the colour bar, the legend and the key of a map are on the paper."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.grid import Grid
from fieldview.publish.figures.marks import legend_entries
from fieldview.publish.figures.panels import Panel
from fieldview.publish.figures.paper import Paper
from fieldview.publish.figures.regions import columns_of, key_lines
from fieldview.publish.units_shown import UnitView, unit_view
from fieldview.session.figures import FigureSettings
from fieldview.session.replay import Workbench


@dataclass(frozen=True, eq=False)
class Sheet:
    """Where things are on the paper. [mm]"""

    paper: Paper
    view: UnitView
    count: int
    extent: tuple[float, float, float, float]
    left: float
    right: float
    top: float
    bottom: float
    foot: float
    gap: tuple[float, float]
    key: list[str]
    key_columns: int
    columns: int = 1

    @classmethod
    def laid_out(cls, bench: Workbench, settings: FigureSettings, panels: list[Panel]) -> Sheet:
        paper = Paper(settings)
        em = paper.em
        grid = panels[0].field.grid
        x0, x1, y0, y1 = _extent(grid)
        wide, high = x1 - x0 or 1.0, y1 - y0 or 1.0
        titled = len(panels) > 1
        left, right = 4.6 * em, 6.8 * em
        room = paper.width - 2 * em
        key = key_lines(bench, panels[0].field if not titled else None, settings, room / em)
        key_columns = columns_of(key, room, em)
        deep = max((text.count("\n") + 1 for text in key), default=0)
        foot = (0.5 + 1.45 * deep * -(-len(key) // max(key_columns, 1))) * em
        legend = 1.6 * em if settings.marks and legend_entries(panels) else 0.0
        top = (1.9 if settings.arrows else 0.8) + (1.8 if settings.title else 0) + (1.3 if titled else 0)
        sheet = cls(
            paper,
            length_view(bench, settings, max(wide, high)),
            len(panels),
            (x0, x1, y0, y1),
            left,
            right,
            top * em,
            foot + legend + 3.2 * em,
            foot,
            (1.2 * em, (2.2 if titled else 1.0) * em),
            key,
            key_columns,
        )
        return sheet._divided(settings)

    def _divided(self, settings: FigureSettings) -> Sheet:
        """With as many columns as asked for, or as bring the page nearest to a square."""
        if settings.columns is not None:
            return self._checked(replace(self, columns=min(settings.columns, self.count)))
        ways = [replace(self, columns=columns) for columns in range(1, self.count + 1)]
        ways = [way for way in ways if way.cell[0] > 8 * self.paper.em] or ways[:1]
        return self._checked(min(ways, key=lambda way: abs(np.log(way.height / way.paper.width))))

    def _checked(self, sheet: Sheet) -> Sheet:
        em, (width, height) = self.paper.em, sheet.cell
        if width < 8 * em:
            raise InputError(
                f"{sheet.columns} panels side by side leave {max(width, 0):.0f} mm for each; "
                "widen the figure, take fewer columns or smaller text"
            )
        if height < 4 * em:
            raise InputError("the height leaves no room for the map; raise it or leave it out")
        return sheet

    @property
    def rows(self) -> int:
        return -(-self.count // self.columns)

    @property
    def cell(self) -> tuple[float, float]:
        """Width and height of a panel."""
        x0, x1, y0, y1 = self.extent
        width = (self.paper.width - self.left - self.right - (self.columns - 1) * self.gap[0]) / self.columns
        stated = self.paper.settings.height_mm
        if stated is None:
            return width, width * (y1 - y0 or 1.0) / (x1 - x0 or 1.0)
        return width, (stated - self.top - self.bottom - (self.rows - 1) * self.gap[1]) / self.rows

    @property
    def height(self) -> float:
        return self.top + self.bottom + self.rows * self.cell[1] + (self.rows - 1) * self.gap[1]

    @property
    def millimetres_per_length(self) -> float:
        x0, x1, y0, y1 = self.extent
        return min(self.cell[0] / (x1 - x0), self.cell[1] / (y1 - y0))

    def figure(self):
        from matplotlib.figure import Figure

        return Figure(figsize=(self.paper.width / 25.4, self.height / 25.4))

    def rectangle(self, place: int) -> tuple[float, float, float, float]:
        """Left, bottom, width, height of a panel as shares of the figure."""
        row, column = divmod(place, self.columns)
        x = self.left + column * (self.cell[0] + self.gap[0])
        y = self.bottom + (self.rows - 1 - row) * (self.cell[1] + self.gap[1])
        return (
            x / self.paper.width,
            y / self.height,
            self.cell[0] / self.paper.width,
            self.cell[1] / self.height,
        )

    def is_left(self, place: int) -> bool:
        return place % self.columns == 0

    def is_lowest(self, place: int, count: int) -> bool:
        return place + self.columns >= count


def length_view(bench: Workbench, settings: FigureSettings, extent: float) -> UnitView:
    """Millimetres for what is smaller than a metre, unless the settings say otherwise."""
    metric = str(bench.units) == "m, s"
    choice = settings.length_unit or ("mm" if metric and extent < 1 else "m")
    if choice != "mm" or not metric:
        return UnitView()
    # positions in millimetres; velocities and rates stay in metres, as the trade writes them
    return replace(unit_view(bench.session, "mm"), time=1.0)


def _extent(grid: Grid) -> tuple[float, float, float, float]:
    """Left, right, lower and upper edge of the cells about the nodes, in the plane."""
    edges = []
    # a single row or column is drawn as a band a quarter as wide as it is long
    band = 0.25 * max(float(np.ptp(grid.x)), float(np.ptp(grid.y))) or 1.0
    for axis in (grid.x, grid.y):
        steps = np.diff(axis) if axis.size > 1 else np.full(1, band)
        edges.append((axis[0] - 0.5 * steps[0], axis[-1] + 0.5 * steps[-1]))
    corners = grid.placement.to_plane(np.add.outer(np.array(edges[0]), 1j * np.array(edges[1])))
    return (
        float(corners.real.min()),
        float(corners.real.max()),
        float(corners.imag.min()),
        float(corners.imag.max()),
    )
