"""Regions on a map: outlines in their colours and dashes, and a key of names and numbers below it."""

from __future__ import annotations

import numpy as np

from fieldview.compute.field import Field
from fieldview.compute.numbers import Number
from fieldview.compute.region import measure_region, prepare
from fieldview.publish import looks, wording
from fieldview.publish.figures.paper import Paper, plain
from fieldview.publish.region_numbers import symbol
from fieldview.publish.units_shown import UnitView
from fieldview.session.figures import FigureSettings
from fieldview.session.models import Session
from fieldview.session.regions import Region
from fieldview.session.replay import Workbench

_LETTER = 0.56
"""Mean width of a letter. [em]"""

_SAMPLE = 3.6
"""Width of a line's sample in the key with the room beside it. [em]"""


def draw_regions(axes, session: Session, settings: FigureSettings, view: UnitView) -> None:
    """The outline of every region of the session."""
    for place, region in enumerate(session.regions):
        z = _outline(region, view)
        axes.plot(z.real, z.imag, zorder=5, **_line(region, place, settings))


def draw_numbers(axes, session: Session, field: Field, settings: FigureSettings, view: UnitView) -> None:
    """The number of every region beside it, where one of several panels has no key of its own."""
    if not settings.numbers:
        return
    from matplotlib.patheffects import withStroke

    ready, halo = prepare(field), [withStroke(linewidth=settings.font_pt / 2.2, foreground="white")]
    taken: list[tuple[float, float, float, float]] = []
    for place, region in enumerate(session.regions):
        name, number = number_of(region, field, ready, session, settings)
        if number.value is None:
            continue
        shown, spread = wording.pair(number.value, number.combined)
        text = (
            f"{symbol(name)} {shown} ± {spread}" if number.combined is not None else f"{symbol(name)} {shown}"
        )
        at = _free_place(axes, _outline(region, view), text, settings, taken)
        axes.text(
            *at,
            text,
            ha="center",
            va="center",
            color=colour_of(region, place),
            size=0.85 * settings.font_pt,
            path_effects=halo,
            zorder=6,
        )


def _free_place(axes, z: np.ndarray, text: str, settings: FigureSettings, taken: list) -> tuple[float, float]:
    """Above, below or within the outline, wherever there is room; remembered in ``taken``."""
    from matplotlib.transforms import Bbox

    box = axes.get_position()
    inches = axes.figure.get_size_inches()
    (x0, x1), (y0, y1) = axes.get_xlim(), axes.get_ylim()
    per_mm = (x1 - x0) / (box.width * inches[0] * 25.4), (y1 - y0) / (box.height * inches[1] * 25.4)
    em = Paper(settings).em * 0.85
    half = 0.5 * _LETTER * em * len(text) * per_mm[0], 0.75 * em * per_mm[1]
    middle = 0.5 * (z.real.min() + z.real.max())
    middle = min(max(middle, x0 + half[0]), x1 - half[0])
    levels = [z.imag.max() + half[1], z.imag.min() - half[1], z.imag.mean(), y1 - half[1], y0 + half[1]]
    levels = [min(max(level, y0 + half[1]), y1 - half[1]) for level in levels]

    def overlap(level: float) -> float:
        own = Bbox.from_extents(middle - half[0], level - half[1], middle + half[0], level + half[1])
        parts = (Bbox.intersection(own, Bbox.from_extents(*other)) for other in taken)
        return sum(part.width * part.height for part in parts if part is not None)

    best = min(levels, key=overlap)
    taken.append((middle - half[0], best - half[1], middle + half[0], best + half[1]))
    return middle, best


def key_lines(bench: Workbench, field: Field | None, settings: FigureSettings, room: float) -> list[str]:
    """What the key says of every region: its name, and its number where there is one field for all.

    In two lines where one is longer than the ``room``. [em]
    """
    session = bench.session
    if not settings.regions:
        return []
    if field is None or not settings.numbers:
        return [region.name for region in session.regions]
    ready = prepare(field)
    lines = [
        (region.name, number_text(number_of(region, field, ready, session, settings)))
        for region in session.regions
    ]
    most = int((room - _SAMPLE) / _LETTER)
    between = ":\n" if any(len(name) + len(text) + 3 > most for name, text in lines) else ":  "
    return [between.join(line) for line in lines]


def columns_of(lines: list[str], room: float, em: float) -> int:
    """Columns of a key that fit into so many millimetres."""
    if not lines:
        return 0
    longest = max(len(part) for line in lines for part in line.split("\n"))
    widest = (_SAMPLE + _LETTER * longest + 1.5) * em
    return max(1, min(len(lines), int(room / widest)))


def draw_key(
    figure,
    session: Session,
    lines: list[str],
    at: tuple[float, float],
    columns: int,
    settings: FigureSettings,
) -> None:
    """A sample of every outline with its text, below the map; ``at`` is the upper left corner [mm]."""
    from matplotlib.lines import Line2D

    handles = [
        Line2D([], [], label=plain(text), **_line(region, place, settings))
        for place, (region, text) in enumerate(zip(session.regions, lines, strict=True))
    ]
    width, height = (25.4 * size for size in figure.get_size_inches())
    figure.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(at[0] / width, at[1] / height),
        ncols=columns,
        frameon=False,
        borderpad=0,
        borderaxespad=0.2,
        handlelength=2.6,
        handletextpad=0.6,
        labelspacing=0.35,
        columnspacing=1.5,
    )


def colour_of(region: Region, place: int) -> str:
    return region.colour or looks.REGION_COLOURS[place % len(looks.REGION_COLOURS)]


def number_of(region: Region, field: Field, ready, session: Session, settings: FigureSettings):
    """(name of the number, Number) that a figure shows of a region."""
    numbers = measure_region(field, region.outline(), line=session.line, prepared=ready)
    closed, open_ = {"circulation": ("circulation", "line_integral"), "flux": ("flux", "cross_flow")}[
        settings.number
    ]
    for name in (closed, open_, "through_flow"):
        found: Number | None = getattr(numbers, name)
        if found is not None:
            return name, found
    return closed, Number(None, field.units.circulation)


def number_text(named: tuple[str, Number]) -> str:
    """``Γ = 0.00965 ± 0.00013 m²/s``."""
    name, number = named
    if number.value is None:
        return f"{symbol(name)} has no value"
    return f"{symbol(name)} = {wording.plus_minus(number.value, number.combined, number.unit)}"


def _outline(region: Region, view: UnitView) -> np.ndarray:
    shape = region.outline()
    z = view.length * shape.vertices
    return np.append(z, z[0]) if shape.closed else z


def _line(region: Region, place: int, settings: FigureSettings) -> dict:
    dash = looks.REGION_DASHES[place % len(looks.REGION_DASHES)]
    return {
        "color": colour_of(region, place),
        "lw": Paper(settings).line(1.5),
        "ls": (0, tuple(0.8 * part for part in dash)) if dash else "-",
    }
