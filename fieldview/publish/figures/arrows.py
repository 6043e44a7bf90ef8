"""Arrows on paper: thinned to a least distance, filled ones in their own colour, with a reference."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.field import Field, Status
from fieldview.publish import looks, wording
from fieldview.publish.figures.paper import Paper
from fieldview.publish.units_shown import UnitView
from fieldview.session.figures import FigureSettings

_REACH = 1.5
"""Length of a fast arrow in distances between arrows."""


@dataclass(frozen=True)
class Arrows:
    """How the arrows of a map are drawn.

    Attributes
    ----------
    every : (int, int)
        Nodes along x and y from one arrow to the next.
    millimetres_per_speed : float
    speed : float
        The speed that few arrows exceed. [velocity]
    unit : str
    """

    every: tuple[int, int]
    millimetres_per_speed: float
    speed: float
    unit: str


def arrows_of(field: Field, millimetres: float, settings: FigureSettings) -> Arrows | None:
    """None where there is no velocity in the plane, or none but zero."""
    if not field.in_plane or not settings.arrows:
        return None
    speed = np.hypot(field.u, field.v)
    known = speed[np.isfinite(speed)]
    typical = float(np.percentile(known, 95)) if known.size else 0.0
    if typical <= 0:
        return None
    steps = [step if np.isfinite(step) else 0.0 for step in field.grid.spacing]
    least = settings.arrow_spacing_mm / millimetres
    every = tuple(max(1, int(np.ceil(least / step))) if step else 1 for step in steps)
    shown = max((step * n * millimetres for step, n in zip(steps, every, strict=True)), default=1.0)
    length = _REACH * shown * settings.arrow_length
    return Arrows(every, length / typical, typical, field.units.velocity)


def draw_arrows(
    axes, field: Field, millimetres: float, settings: FigureSettings, view: UnitView
) -> Arrows | None:
    """Tails on the nodes; returns how they were drawn.

    Parameters
    ----------
    axes : matplotlib axes
    field : Field
    millimetres : float
        On paper for one unit of length.
    """
    arrows = arrows_of(field, millimetres, settings)
    if arrows is None:
        return None
    part = (slice(None, None, arrows.every[1]), slice(None, None, arrows.every[0]))
    nodes = view.length * field.grid.nodes[part]
    u, v, status = field.u[part], field.v[part], field.status[part]
    # velocity over this scale is a length on the axes
    scale = millimetres / (arrows.millimetres_per_speed * view.length)
    paper = Paper(settings)
    for wanted, colour in ((Status.MEASURED, looks.INK), (Status.FILLED, looks.FILLED)):
        chosen = (status == wanted) & np.isfinite(u) & np.isfinite(v)
        if chosen.any():
            axes.quiver(
                nodes.real[chosen],
                nodes.imag[chosen],
                u[chosen],
                v[chosen],
                color=colour,
                angles="xy",
                scale_units="xy",
                scale=scale,
                units="inches",
                width=paper.line(0.55) / 72,
                headwidth=4.5,
                headlength=5.5,
                headaxislength=4.8,
                minlength=0.6,
                pivot="tail",
                zorder=3,
            )
    return arrows


def reference_arrow(figure, axes, arrows: Arrows, paper: Paper) -> None:
    """An arrow of a round speed, above the map at its right end."""
    from matplotlib.patches import FancyArrow

    speed = wording.nice_step(1.6 * arrows.speed, 1)
    em = paper.em
    width, height = (25.4 * size for size in figure.get_size_inches())
    long = speed * arrows.millimetres_per_speed
    if long > 12 * em:
        speed, long = speed / 2, long / 2
    _, y0, _, high = axes.get_position().bounds
    x1 = axes.get_position().x1
    y = y0 + high + 1.1 * em / height
    text = f"{speed:g} {wording.unit_text(arrows.unit)}"
    start = x1 - (long + 0.2 * em) / width
    arrow = FancyArrow(
        start * width,
        y * height,
        long,
        0,
        width=0.09 * em,
        head_width=0.45 * em,
        head_length=0.55 * em,
        length_includes_head=True,
        color=looks.INK,
        lw=0,
    )
    from matplotlib.transforms import Affine2D

    arrow.set_transform(Affine2D().scale(1 / width, 1 / height) + figure.transFigure)
    figure.add_artist(arrow)
    figure.text(start - 0.5 * em / width, y, text, ha="right", va="center")
