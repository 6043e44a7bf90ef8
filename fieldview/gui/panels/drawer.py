"""The drawer: the chosen region around its contour, as it grows, over time, along a line, and its budget."""

from __future__ import annotations

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QStackedWidget, QTabBar, QVBoxLayout, QWidget

from fieldview.compute.units import METRIC, Units
from fieldview.gui import theme as themes
from fieldview.gui.panels.base import label
from fieldview.gui.panels.budget import Budget
from fieldview.gui.panels.plots import Plot
from fieldview.gui.panels.shape import Shape
from fieldview.gui.panels.traces import trace_entry, trace_of
from fieldview.gui.picture import Picture
from fieldview.gui.theme import LIGHT, Theme

TABS = (
    ("around", "Around"),
    ("growth", "Growth"),
    ("over_time", "Over time"),
    ("profile", "Profile"),
    ("budget", "Budget"),
    ("shape", "Shape"),
)


NO_COMPONENTS = "The field has no components in the plane."


class Drawer(QWidget):
    """Shows one of its pages; what a page needs is computed only while it is the one shown."""

    def __init__(self, desk, parent=None):
        super().__init__(parent)
        self.desk = desk
        self.theme: Theme = LIGHT
        self.setObjectName("drawer")
        self.setAccessibleName("Drawer of the chosen region")
        self.setProperty("role", "paper")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        column = QVBoxLayout(self)
        column.setContentsMargins(8, 4, 8, 4)
        column.setSpacing(2)
        self.tabs = QTabBar()
        self.tabs.setDrawBase(False)
        self.tabs.setExpanding(False)
        self.tabs.setAccessibleName("What the drawer shows")
        for _, title in TABS:
            self.tabs.addTab(title)
        self.tabs.tabBarClicked.connect(lambda place: desk.show(drawer=TABS[place][0]))
        self.tabs.currentChanged.connect(lambda place: desk.show(drawer=TABS[place][0]))
        column.addWidget(self.tabs)
        self.pages = QStackedWidget()
        self.plot, self.budget, self.shape = Plot("drawer_plot"), Budget(), Shape(desk)
        for page in (self.plot, self.budget, self.shape):
            self.pages.addWidget(page)
        column.addWidget(self.pages, 1)
        self.said = label("", "muted", wrap=True)
        column.addWidget(self.said)
        self._seen: tuple | None = None

    def set_theme(self, theme: Theme) -> None:
        self.theme = self.budget.theme = theme
        self.plot.set_theme(theme)
        self._seen = None

    def draw(self, picture: Picture) -> None:
        place = next(i for i, (name, _) in enumerate(TABS) if name == picture.shown.drawer)
        if self.tabs.currentIndex() != place:
            self.tabs.setCurrentIndex(place)
        self.pages.setCurrentIndex({"budget": 1, "shape": 2}.get(picture.shown.drawer, 0))
        name, region = picture.shown.drawer, picture.selected
        curve = picture.curve_now
        shown = picture.shown
        seen = (
            name,
            region,
            curve,
            picture.session,
            _in_plane(picture),
            picture.traces if name == "over_time" else None,
            shown.coverage,
            shown.frame if name == "over_time" else None,
            shown.units,
            shown.trace,
            self.theme,
        )
        if name == "budget":
            self.budget.draw(picture)
            self.said.setText("")
        elif name == "shape":
            self.shape.draw(picture)
            self.said.setText("Double click or F2 to type a number." if region else "Choose a region.")
        elif self._seen is None or any(a is not b for a, b in zip(seen, self._seen, strict=True)):
            self._seen = seen
            self.said.setText(_DRAW[name](self.plot, picture, self._colour(picture)))

    def _colour(self, picture: Picture) -> str:
        for place, region in enumerate(picture.regions):
            if region.name == picture.shown.selected:
                return themes.region_colour(region.colour, place)
        return themes.region_colour(None, 0)


def _draw_around(plot: Plot, picture: Picture, colour: str) -> str:
    """Tangential and normal component against arc length of a contour."""
    region, curve = picture.selected, picture.curve_now
    _along_axes(plot, picture)
    if region is None:
        return "Choose a region."
    if region.shape == "line":
        return "A line's components are under Profile."
    return _draw_components(plot, picture, curve, colour, ("tangential", "normal, outward"))


def _draw_profile(plot: Plot, picture: Picture, colour: str) -> str:
    """The components along a line."""
    region, curve = picture.selected, picture.curve_now
    _along_axes(plot, picture)
    if region is None or region.shape != "line":
        return "Choose a line, or draw one (L)."
    return _draw_components(plot, picture, curve, colour, ("along the line", "across, to the right"))


def _along_axes(plot: Plot, picture: Picture) -> None:
    view, units = picture.unit_view, _units(picture)
    plot.start(view.label("arc length", units.length), view.label("velocity", units.velocity))


def _draw_components(plot: Plot, picture: Picture, curve, colour: str, words) -> str:
    if not _in_plane(picture):
        return NO_COMPONENTS
    if curve is None:
        return "working …"
    units, view = _units(picture), picture.unit_view
    _two_lines(plot, picture, colour, view.of(units.length)[0], view.of(units.velocity)[0])
    return f"solid: {words[0]} · dashed: {words[1]}"


def _two_lines(plot: Plot, picture: Picture, colour: str, x_factor: float, factor: float) -> None:
    """The curve's first quantity solid, its second dashed, each with its band of ± U."""
    curve, k = picture.curve_now, picture.shown.coverage
    spread = [None if u is None else k * factor * np.asarray(u) for u in (curve.u_first, curve.u_second)]
    x = x_factor * curve.x
    plot.add_line(x, factor * curve.first, colour, spread=spread[0])
    plot.add_line(x, factor * curve.second, plot.theme.muted, spread=spread[1], dash=(4, 3))


def _in_plane(picture: Picture) -> bool:
    return picture.field is not None and picture.field.in_plane


def _units(picture: Picture) -> Units:
    return picture.field.units if picture.field is not None else METRIC


def _draw_growth(plot: Plot, picture: Picture, colour: str) -> str:
    """Γ and Φ as the contour is scaled about its centroid."""
    region, curve = picture.selected, picture.curve_now
    unit = _units(picture).circulation
    plot.start("scale of the contour", picture.unit_view.label("Γ, Φ", unit))
    if region is None:
        return "Choose a region."
    if region.shape == "line":
        return "A line encloses nothing that could grow."
    if not _in_plane(picture):
        return NO_COMPONENTS
    if curve is None:
        return "working …"
    _two_lines(plot, picture, colour, 1.0, picture.unit_view.of(unit)[0])
    plot.add_mark(1.0, "drawn")
    return "solid: Γ · dashed: Φ · a plateau of Γ means that the vortex is inside"


def _draw_over_time(plot: Plot, picture: Picture, colour: str) -> str:
    """The chosen region's number on every frame measured so far."""
    region = picture.selected
    known = picture.run is not None and any(t is not None for t in picture.run.times)
    entry = trace_entry(picture, region.name) if region is not None else None
    label = picture.unit_view.label(entry[0].symbol, entry[1]) if entry else ""
    plot.start("time [s]" if known else "frame", label, zero=False)
    if region is None:
        return "Choose a region."
    points = trace_of(picture, region.name)
    if not points or entry is None:
        return "Press Follow over run to measure every frame."
    frames = [frame for frame, _, _ in points]
    x = [picture.run.times[f] for f in frames] if known else [f + 1 for f in frames]
    factor, k = picture.unit_view.of(entry[1])[0], picture.shown.coverage
    spread = np.array([np.nan if u is None else factor * k * u for _, _, u in points])
    plot.add_line(x, [factor * value for _, value, _ in points], colour, spread=spread)
    if picture.shown.frame in frames:
        plot.add_mark(x[frames.index(picture.shown.frame)], "")
    return f"{len(points)} of {picture.run.frames} frames; band: ± U, k = {k:g}"


_DRAW = {
    "around": _draw_around,
    "growth": _draw_growth,
    "over_time": _draw_over_time,
    "profile": _draw_profile,
}
