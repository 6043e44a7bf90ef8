"""Marks of what was cleaned: rejected, missing, filled and masked nodes, and the legend that names them."""

from __future__ import annotations

from fieldview.compute.field import Field, Status
from fieldview.publish import looks
from fieldview.publish.figures.panels import Panel
from fieldview.publish.units_shown import UnitView
from fieldview.session.figures import FigureSettings


def draw_marks(axes, field: Field, settings: FigureSettings, view: UnitView) -> None:
    """Rejected, missing, filled and masked nodes: shape first, colour second."""
    nodes, size = view.length * field.grid.nodes, settings.font_pt
    for status, options in _MARKS.items():
        chosen = field.status == status
        if chosen.any():
            axes.plot(nodes.real[chosen], nodes.imag[chosen], zorder=4, **_sized(options, size))
    rejected = field.once_rejected & (field.status == Status.FILLED)
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


def legend_entries(panels: list[Panel]) -> list[str]:
    held = set()
    for panel in panels:
        field = panel.field
        held |= {status for status in _WORDS if (field.status == status).any()}
        if field.once_rejected.any():
            held.add(Status.REJECTED)
    return [status for status in _WORDS if status in held]


_WORDS = {
    Status.FILLED: "filled",
    Status.REJECTED: "rejected",
    Status.MISSING: "missing",
    Status.MASKED: "masked",
}


def draw_legend(figure, panels: list[Panel], settings: FigureSettings, at: tuple[float, float]) -> None:
    """Words for the marks that occur, in a row; ``at`` is its lower left corner in shares of the figure."""
    entries = legend_entries(panels) if settings.marks else []
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
        bbox_to_anchor=at,
        ncols=len(handles),
        frameon=False,
        borderpad=0,
        borderaxespad=0,
        handletextpad=0.3,
        columnspacing=1.2,
        handlelength=1.2,
    )
