"""Maps of the field: colours, arrows, iso-lines, regions with their numbers, marks of what was cleaned."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid
from fieldview.compute.quantities import QUANTITIES, quantity
from fieldview.publish import looks, wording
from fieldview.publish.figures.arrows import draw_arrows, reference_arrow
from fieldview.publish.figures.paper import POINT, Paper, plain
from fieldview.publish.figures.regions import columns_of, draw_key, draw_numbers, draw_regions, key_lines
from fieldview.publish.units_shown import UnitView, unit_view
from fieldview.session.figures import FigureSettings
from fieldview.session.replay import Frame, Workbench

_BAR = 0.9
"""Width of the colour bar. [em]"""


@dataclass(frozen=True, eq=False)
class Panel:
    """One map: a frame and a quantity.

    Attributes
    ----------
    frame : int or str
    field : Field
    name : str
        Of the quantity.
    """

    frame: Frame
    field: Field
    name: str

    @cached_property
    def values(self) -> np.ndarray:
        return quantity(self.field, self.name)


@dataclass(frozen=True)
class Scale:
    """What the colours mean.

    Attributes
    ----------
    low, high : float
        [unit]
    kind : "signed", "unsigned" or "cyclic"
    beyond : "neither", "min", "max" or "both"
        Where values lie outside.
    """

    low: float
    high: float
    kind: str
    beyond: str

    @property
    def colours(self):
        from matplotlib.colors import ListedColormap

        if self.kind == "signed":
            table = looks.diverging(*looks.SIGNED_MAP)
        else:
            table = looks.even_steps(*(looks.CYCLIC_MAP if self.kind == "cyclic" else looks.UNSIGNED_MAP))
        return ListedColormap(table / 255)


def field_maps(bench: Workbench, settings: FigureSettings):
    """One panel for every frame and quantity, all with one scale of colours."""
    panels = panels_of(bench, settings)
    return drawn(bench, settings, panels, colour_scale(panels, settings))


def panels_of(bench: Workbench, settings: FigureSettings) -> list[Panel]:
    """Raises InputError for frames and quantities that are not there, or do not share a unit."""
    for name in settings.quantities:
        if name not in QUANTITIES:
            raise InputError(f'quantity "{name}" is not known; the quantities are: {", ".join(QUANTITIES)}')
    units = {QUANTITIES[name].unit(bench.units) for name in settings.quantities}
    if len(units) > 1:
        raise InputError(
            f"{' and '.join(settings.quantities)} have different units and cannot share colours; "
            "make a figure of each"
        )
    fields = {frame: bench.field(frame) for frame in bench.frames(settings.frames)}
    return [Panel(frame, field, name) for name in settings.quantities for frame, field in fields.items()]


def colour_scale(panels: list[Panel], settings: FigureSettings) -> Scale:
    """Symmetric for signed quantities; nearly all values lie within, and it is shown where some do not."""
    entry = QUANTITIES[panels[0].name]
    known = np.concatenate([panel.values[np.isfinite(panel.values)] for panel in panels])
    if known.size == 0:
        raise InputError(f"{entry.title.lower()} has no value anywhere on this frame; nothing can be drawn")
    if entry.angle:
        return Scale(-np.pi, np.pi, "cyclic", "neither")
    # a flow all one way is not shown on a scale for two
    signed = any(QUANTITIES[panel.name].signed for panel in panels) and known.min() < -0.02 * known.max()
    most = wording.round_up(float(np.percentile(np.abs(known), 99.5)))
    low = settings.low if settings.low is not None else -most if signed else 0.0
    high = settings.high if settings.high is not None else most
    if not low < high:
        raise InputError(f"the colours would run from {low:g} to {high:g}; give low and high in order")
    even = signed and abs(low + high) <= 1e-9 * (high - low)
    below, above = bool((known < low).any()), bool((known > high).any())
    beyond = {0: "neither", 1: "min", 2: "max", 3: "both"}[below + 2 * above]
    return Scale(low, high, "signed" if even else "unsigned", beyond)


def drawn(bench: Workbench, settings: FigureSettings, panels: list[Panel], scale: Scale):
    """The figure of these panels."""
    sheet = _Sheet.laid_out(bench, settings, panels)
    figure = sheet.figure()
    view = sheet.view
    for place, panel in enumerate(panels):
        axes = figure.add_axes(sheet.rectangle(place))
        mapped = _paint(axes, panel, scale, view)
        _iso_lines(axes, panel.field, settings, view)
        if settings.marks:
            _marks(axes, panel.field, settings, view)
        arrows = draw_arrows(axes, panel.field, sheet.millimetres_per_length, settings, view)
        if settings.regions:
            draw_regions(axes, bench.session, settings, view)
            if len(panels) > 1:
                draw_numbers(axes, bench.session, panel.field, settings, view)
        _frame_axes(axes, sheet, place, panel, panels)
        if place == 0 and arrows is not None:
            reference_arrow(figure, axes, arrows, sheet.paper)
        if settings.scale_bar and place == 0:
            _scale_bar(axes, sheet, view, panel.field.units.length)
    _colour_bar(figure, sheet, mapped, scale, panels[0])
    _legend(figure, panels, settings, sheet)
    if sheet.key:
        draw_key(figure, bench.session, sheet.key, (sheet.paper.em, sheet.foot), sheet.key_columns, settings)
    if settings.title:
        top = 1 - 0.4 * sheet.paper.em / sheet.height
        figure.text(0.5, top, plain(settings.title), ha="center", va="top", weight="bold")
    return figure


def length_view(bench: Workbench, settings: FigureSettings, extent: float) -> UnitView:
    """Millimetres for what is smaller than a metre, unless the settings say otherwise."""
    metric = str(bench.units) == "m, s"
    choice = settings.length_unit or ("mm" if metric and extent < 1 else "m")
    if choice != "mm" or not metric:
        return UnitView()
    # positions in millimetres; velocities and rates stay in metres, as the trade writes them
    return replace(unit_view(bench.session, "mm"), time=1.0)


@dataclass(frozen=True, eq=False)
class _Sheet:
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
    def laid_out(cls, bench: Workbench, settings: FigureSettings, panels: list[Panel]) -> _Sheet:
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
        legend = 1.6 * em if settings.marks and _legend_entries(panels) else 0.0
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

    def _divided(self, settings: FigureSettings) -> _Sheet:
        """With as many columns as asked for, or as bring the page nearest to a square."""
        if settings.columns is not None:
            return self._checked(replace(self, columns=min(settings.columns, self.count)))
        ways = [replace(self, columns=columns) for columns in range(1, self.count + 1)]
        ways = [way for way in ways if way.cell[0] > 8 * self.paper.em] or ways[:1]
        return self._checked(min(ways, key=lambda way: abs(np.log(way.height / way.paper.width))))

    def _checked(self, sheet: _Sheet) -> _Sheet:
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


def _extent(grid: Grid) -> tuple[float, float, float, float]:
    """Left, right, lower and upper edge of the cells about the nodes, in the plane."""
    edges = []
    for axis in (grid.x, grid.y):
        steps = np.diff(axis) if axis.size > 1 else np.zeros(1)
        edges.append((axis[0] - 0.5 * steps[0], axis[-1] + 0.5 * steps[-1]))
    corners = grid.placement.to_plane(np.add.outer(np.array(edges[0]), 1j * np.array(edges[1])))
    return (
        float(corners.real.min()),
        float(corners.real.max()),
        float(corners.imag.min()),
        float(corners.imag.max()),
    )


def _paint(axes, panel: Panel, scale: Scale, view: UnitView):
    grid, place = panel.field.grid, panel.field.grid.placement
    factor = view.length
    options = {"cmap": scale.colours, "vmin": scale.low, "vmax": scale.high, "rasterized": True, "zorder": 1}
    if all(grid.is_uniform) and grid.is_plane:
        from matplotlib.transforms import Affine2D

        dx, dy = (0.5 * step for step in grid.spacing)
        extent = (grid.x[0] - dx, grid.x[-1] + dx, grid.y[0] - dy, grid.y[-1] + dy)
        image = axes.imshow(
            panel.values, extent=extent, origin="lower", interpolation="nearest", aspect="equal", **options
        )
        up = place.factor * (-1j if place.mirrored else 1j)
        turn = Affine2D.from_values(
            place.factor.real, place.factor.imag, up.real, up.imag, place.shift.real, place.shift.imag
        )
        image.set_transform(turn + Affine2D().scale(factor) + axes.transData)
        return image
    nodes = factor * grid.nodes
    if not grid.is_plane:
        return axes.scatter(nodes.real, nodes.imag, c=panel.values, marker="s", s=16, **options)
    return axes.pcolormesh(nodes.real, nodes.imag, panel.values, shading="nearest", **options)


def _iso_lines(axes, field: Field, settings: FigureSettings, view: UnitView) -> None:
    if settings.iso_lines is None or not field.grid.is_plane:
        return
    if settings.iso_lines not in QUANTITIES:
        raise InputError(f'iso-lines of "{settings.iso_lines}" are not known; see the quantities')
    values = np.ma.masked_invalid(quantity(field, settings.iso_lines))
    nodes = view.length * field.grid.nodes
    width = Paper(settings).line(0.7)
    axes.contour(nodes.real, nodes.imag, values, 8, colors=looks.MUTED, linewidths=width, zorder=2)


def _marks(axes, field: Field, settings: FigureSettings, view: UnitView) -> None:
    """Rejected, missing, filled and masked nodes: shape first, colour second."""
    nodes, size = view.length * field.grid.nodes, settings.font_pt
    for status, options in _MARKS.items():
        chosen = field.status == status
        if chosen.any():
            axes.plot(nodes.real[chosen], nodes.imag[chosen], zorder=4, **_sized(options, size))
    rejected = _rejected_once(field) & (field.status == Status.FILLED)
    if rejected.any():
        cross = _sized(_MARKS[Status.REJECTED], size)
        axes.plot(nodes.real[rejected], nodes.imag[rejected], zorder=4, **cross)
    masked = field.status == Status.MASKED
    if masked.any() and field.grid.is_plane:
        inside = masked.astype(float)
        axes.contourf(nodes.real, nodes.imag, inside, [0.5, 1.5], colors="none", hatches=["/" * 5], zorder=2)


_MARKS = {
    Status.REJECTED: {"marker": "x", "color": looks.ATTENTION, "share": 0.32},
    Status.MISSING: {"marker": ".", "color": looks.MUTED, "share": 0.34},
    Status.FILLED: {"marker": "o", "color": looks.FILLED, "share": 0.42, "mfc": "none"},
}


def _sized(options: dict, font: float) -> dict:
    made = {key: value for key, value in options.items() if key != "share"}
    return made | {"ls": "none", "ms": options["share"] * font, "mew": font / 14}


def _rejected_once(field: Field) -> np.ndarray:
    nodes = np.zeros(field.grid.shape, bool)
    for event in field.events:
        if event.action == "rejected":
            nodes |= event.nodes
        elif event.action == "kept":
            nodes &= ~event.nodes
    return nodes


def _legend_entries(panels: list[Panel]) -> list[str]:
    held = set()
    for panel in panels:
        field = panel.field
        held |= {status for status in _WORDS if (field.status == status).any()}
        if _rejected_once(field).any():
            held.add(Status.REJECTED)
    return [status for status in _WORDS if status in held]


_WORDS = {
    Status.FILLED: "filled",
    Status.REJECTED: "rejected",
    Status.MISSING: "missing",
    Status.MASKED: "masked",
}


def _legend(figure, panels: list[Panel], settings: FigureSettings, sheet: _Sheet) -> None:
    entries = _legend_entries(panels) if settings.marks else []
    if not entries:
        return
    from matplotlib.lines import Line2D
    from matplotlib.patches import Patch

    handles = []
    for status in entries:
        if status == Status.MASKED:
            handles.append(Patch(facecolor="none", edgecolor=looks.INK, hatch="/" * 5, label="masked"))
        else:
            options = _sized(_MARKS[status], settings.font_pt)
            handles.append(Line2D([], [], label=_WORDS[status], **options))
    figure.legend(
        handles=handles,
        loc="lower left",
        bbox_to_anchor=(sheet.paper.em / sheet.paper.width, sheet.foot / sheet.height),
        ncols=len(handles),
        frameon=False,
        borderpad=0,
        borderaxespad=0,
        handletextpad=0.3,
        columnspacing=1.2,
        handlelength=1.2,
    )


def _frame_axes(axes, sheet: _Sheet, place: int, panel: Panel, panels: list[Panel]) -> None:
    x0, x1, y0, y1 = (sheet.view.length * edge for edge in sheet.extent)
    axes.set_xlim(x0, x1)
    axes.set_ylim(y0, y1)
    axes.set_aspect("equal", adjustable="box", anchor="SW")
    unit = panel.field.units.length
    if sheet.is_lowest(place, len(panels)):
        axes.set_xlabel(sheet.view.label("x", unit), labelpad=0.3 * sheet.paper.settings.font_pt)
    else:
        axes.set_xticklabels([])
    if sheet.is_left(place):
        axes.set_ylabel(sheet.view.label("y", unit), labelpad=0.3 * sheet.paper.settings.font_pt)
    else:
        axes.set_yticklabels([])
    from matplotlib.ticker import MaxNLocator

    for axis, room in ((axes.xaxis, sheet.cell[0]), (axes.yaxis, sheet.cell[1])):
        axis.set_major_locator(MaxNLocator(max(2, int(room / (4.2 * sheet.paper.em))), steps=[1, 2, 5, 10]))
    if len(panels) > 1:
        axes.set_title(_panel_title(panel, panels), loc="left", pad=0.35 * sheet.paper.settings.font_pt)


def _panel_title(panel: Panel, panels: list[Panel]) -> str:
    words = []
    if len({other.name for other in panels}) > 1:
        words.append(QUANTITIES[panel.name].symbol)
    if len({other.frame for other in panels}) > 1:
        words.append(frame_words(panel.frame, panel.field))
    return ", ".join(words)


def frame_words(frame: Frame, field: Field) -> str:
    """``frame 3, t = 0.24 s``, ``mean``, ``phase 45°``."""
    if isinstance(frame, int):
        time = "" if field.time is None else f", t = {field.time:.4g} s"
        return f"frame {frame}{time}"
    if frame.startswith("phase:"):
        bins, number = (int(part) for part in frame.split(":")[1:])
        return f"phase {360 * number / bins:g}°"
    return frame.replace(":", " of frame ")


def _colour_bar(figure, sheet: _Sheet, mapped, scale: Scale, panel: Panel) -> None:
    em, paper = sheet.paper.em, sheet.paper
    span = sheet.rows * sheet.cell[1] + (sheet.rows - 1) * sheet.gap[1]
    x = paper.width - sheet.right + 0.8 * em
    wide, high = _BAR * em / paper.width, span / sheet.height
    axes = figure.add_axes((x / paper.width, sheet.bottom / sheet.height, wide, high))
    bar = figure.colorbar(mapped, cax=axes, extend=scale.beyond, extendfrac=1.2 * em / span)
    entry = QUANTITIES[panel.name]
    names = [QUANTITIES[name].symbol for name in paper.settings.quantities]
    bar.set_label(wording.with_unit(", ".join(names), entry.unit(panel.field.units)))
    bar.outline.set_linewidth(paper.settings.font_pt / 16)
    if scale.kind == "cyclic":
        bar.set_ticks([-np.pi, 0, np.pi], labels=["−π", "0", "π"])
    else:
        from matplotlib.ticker import MaxNLocator

        ticks = min(8, max(2, int(span / (2.6 * em))))
        bar.ax.yaxis.set_major_locator(MaxNLocator(ticks, steps=[1, 2, 5, 10]))


def _scale_bar(axes, sheet: _Sheet, view: UnitView, length_unit: str) -> None:
    """A round length in the lower left corner."""
    from matplotlib.patheffects import withStroke

    x0, x1, y0, _ = sheet.extent
    length = wording.nice_step(x1 - x0, 6)
    _, unit = view.of(length_unit)
    em = sheet.paper.em / sheet.millimetres_per_length
    start, height = (x0 + em) * view.length, (y0 + 0.9 * em) * view.length
    halo = [withStroke(linewidth=sheet.paper.settings.font_pt / 4, foreground="white")]
    axes.plot(
        [start, start + length * view.length],
        [height, height],
        color=looks.INK,
        lw=sheet.paper.line(2.5),
        solid_capstyle="butt",
        zorder=7,
        path_effects=halo,
    )
    shown = f"{length * view.length:g} {unit}".strip()
    axes.annotate(
        shown,
        (start + 0.5 * length * view.length, height),
        (0, 0.25 * sheet.paper.em / POINT),
        textcoords="offset points",
        ha="center",
        va="bottom",
        zorder=7,
        path_effects=halo,
    )
