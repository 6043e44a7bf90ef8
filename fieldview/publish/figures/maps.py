"""Maps of the field: colours, arrows, iso-lines, regions with their numbers, marks of what was cleaned."""

from __future__ import annotations

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.quantities import QUANTITIES, quantity
from fieldview.publish import looks, wording
from fieldview.publish.figures.arrows import draw_arrows, reference_arrow
from fieldview.publish.figures.layout import Sheet
from fieldview.publish.figures.marks import draw_legend, draw_marks
from fieldview.publish.figures.panels import Panel, Scale, colour_scale, panel_title, panels_of
from fieldview.publish.figures.paper import POINT, Paper, plain
from fieldview.publish.figures.regions import draw_key, draw_numbers, draw_regions
from fieldview.publish.units_shown import UnitView
from fieldview.session.figures import FigureSettings
from fieldview.session.replay import Workbench

_BAR = 0.9
"""Width of the colour bar. [em]"""


def field_maps(bench: Workbench, settings: FigureSettings):
    """One panel for every frame and quantity, all with one scale of colours."""
    panels = panels_of(bench, settings)
    return drawn(bench, settings, panels, colour_scale(panels, settings))


def drawn(bench: Workbench, settings: FigureSettings, panels: list[Panel], scale: Scale):
    """The figure of these panels."""
    sheet = Sheet.laid_out(bench, settings, panels)
    figure = sheet.figure()
    view = sheet.view
    for place, panel in enumerate(panels):
        axes = figure.add_axes(sheet.rectangle(place))
        mapped = _paint(axes, panel, scale, view)
        _iso_lines(axes, panel.field, settings, view)
        if settings.marks:
            draw_marks(axes, panel.field, settings, view)
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
    corner = (sheet.paper.em / sheet.paper.width, sheet.foot / sheet.height)
    draw_legend(figure, panels, settings, corner)
    if sheet.key:
        draw_key(figure, bench.session, sheet.key, (sheet.paper.em, sheet.foot), sheet.key_columns, settings)
    if settings.title:
        top = 1 - 0.4 * sheet.paper.em / sheet.height
        figure.text(0.5, top, plain(settings.title), ha="center", va="top", weight="bold")
    return figure


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
        return axes.scatter(
            nodes.real.ravel(), nodes.imag.ravel(), c=panel.values.ravel(), marker="s", s=16, **options
        )
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


def _frame_axes(axes, sheet: Sheet, place: int, panel: Panel, panels: list[Panel]) -> None:
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
        axes.set_title(panel_title(panel, panels), loc="left", pad=0.35 * sheet.paper.settings.font_pt)


def _colour_bar(figure, sheet: Sheet, mapped, scale: Scale, panel: Panel) -> None:
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


def _scale_bar(axes, sheet: Sheet, view: UnitView, length_unit: str) -> None:
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
