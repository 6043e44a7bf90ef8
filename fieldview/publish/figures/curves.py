"""Curves of a region or a probe: growth, around it, along a line, over time, spectrum, convergence."""

from __future__ import annotations

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.growth import around, growth_curve
from fieldview.compute.numbers import Number
from fieldview.compute.quantities import QUANTITIES
from fieldview.compute.shapes import Shape
from fieldview.publish import looks, wording
from fieldview.publish.figures.paper import Paper, plain
from fieldview.publish.figures.regions import colour_of
from fieldview.publish.region_numbers import symbol
from fieldview.session.figures import FigureSettings
from fieldview.session.measure import region_named
from fieldview.session.regions import Region
from fieldview.session.replay import Workbench
from fieldview.session.traces import Trace, probe_trace, region_trace

FACTORS = np.linspace(0.2, 2.0, 37)
"""By which a contour is scaled about its centroid."""

_HEIGHT = 0.62
"""Of the width, where the settings do not say."""

_FIRST, _SECOND = looks.REGION_COLOURS[:2]


def growth(bench: Workbench, settings: FigureSettings):
    """The region's number as its contour is scaled: a plateau means the vortex is inside."""
    region, _ = chosen_region(bench, settings)
    shape = _closed(region)
    field = _one_frame(bench, settings)
    if not field.in_plane:
        raise InputError("a growth curve needs u and v; this field has no components in the plane")
    curve = growth_curve(field, shape, FACTORS, line=bench.session.line)
    numbers = curve.circulation if settings.number == "circulation" else curve.flux
    figure, axes = _sheet(settings)
    axes.axvline(1.0, color=looks.MUTED, lw=Paper(settings).line(0.6), ls=(0, (3, 2)))
    _banded(axes, np.array(curve.factors), numbers, settings)
    axes.set_xlabel(plain(f"size of {region.name}, as drawn = 1"))
    axes.set_ylabel(wording.with_unit(symbol(settings.number), field.units.circulation))
    return _titled(figure, axes, settings)


def around_contour(bench: Workbench, settings: FigureSettings):
    """Tangential and outward velocity along the contour."""
    region, _ = chosen_region(bench, settings)
    return _along(bench, settings, region, ("along the contour", "outward"))


def profile(bench: Workbench, settings: FigureSettings):
    """Velocity along a line and across it, to the right of travel."""
    region, _ = chosen_region(bench, settings, line=True)
    return _along(bench, settings, region, ("along the line", "to the right of it"))


def over_time(bench: Workbench, settings: FigureSettings):
    """The number of a region or the reading of a probe, frame by frame, with its random uncertainty."""
    trace, colour = _trace(bench, settings)
    figure, axes = _sheet(settings)
    at, label = _instants(trace)
    if trace.uncertainties is not None:
        low, high = trace.values - trace.uncertainties, trace.values + trace.uncertainties
        axes.fill_between(at, low, high, color=colour, alpha=0.25, lw=0)
    paper = Paper(settings)
    axes.plot(at, trace.values, color=colour, marker="o", ms=0.3 * settings.font_pt, lw=paper.line(0.9))
    axes.set_xlabel(label)
    axes.set_ylabel(_label(trace))
    return _titled(figure, axes, settings, _of(trace))


def spectrum(bench: Workbench, settings: FigureSettings):
    """Power spectral density with its band, and the dominant frequency."""
    trace, colour = _trace(bench, settings)
    found, main = trace.spectrum(), trace.dominant_frequency()
    figure, axes = _sheet(settings)
    some = found.frequency > 0
    axes.fill_between(found.frequency[some], found.low[some], found.high[some], color=colour, alpha=0.2, lw=0)
    axes.plot(found.frequency[some], found.density[some], color=colour)
    axes.axvline(main.frequency, color=looks.MUTED, lw=Paper(settings).line(0.6), ls=(0, (3, 2)))
    time = "s" if trace.interval is not None else "frame"
    unit = "Hz" if time == "s" else "1/frame"
    shown = wording.plus_minus(main.frequency, main.uncertainty, unit)
    axes.annotate(
        shown,
        (main.frequency, 0.98),
        (0.4 * settings.font_pt, 0),
        xycoords=("data", "axes fraction"),
        textcoords="offset points",
        va="top",
    )
    axes.set_yscale("log")
    axes.set_xlabel(f"frequency [{unit}]")
    squared = wording.unit_text(_squared(trace.unit))
    axes.set_ylabel(f"spectral density [{f'{squared} {time}'.strip()}]")
    return _titled(figure, axes, settings, f"{_symbol(trace)} {_of(trace)}")


def convergence(bench: Workbench, settings: FigureSettings):
    """The mean over the first n frames, with the uncertainty that the correlation in time leaves."""
    trace, colour = _trace(bench, settings)
    found = trace.convergence()
    figure, axes = _sheet(settings)
    number = np.arange(1, found.mean.size + 1)
    low, high = found.mean - found.mean_uncertainty, found.mean + found.mean_uncertainty
    axes.fill_between(number, low, high, color=colour, alpha=0.25, lw=0)
    axes.plot(number, found.mean, color=colour)
    axes.set_xlim(1, number[-1])
    axes.set_xlabel("frames taken")
    axes.set_ylabel(f"mean {_label(trace)}")
    return _titled(figure, axes, settings, _of(trace))


def chosen_region(bench: Workbench, settings: FigureSettings, *, line: bool = False) -> tuple[Region, int]:
    """The region of a curve and its place: the one named, else the first that fits."""
    regions = bench.session.regions
    if settings.region is not None:
        region = region_named(bench.session, settings.region)
    else:
        fits = [region for region in regions if region.outline().closed != line]
        if not fits:
            what = "line" if line else "closed region"
            raise InputError(f"the session has no {what} for this curve; draw one or name a region")
        region = fits[0]
    if line and region.outline().closed:
        raise InputError(f"{region.name} is a closed region; a profile needs a line")
    return region, regions.index(region)


def _closed(region: Region) -> Shape:
    shape = region.outline()
    if not shape.closed:
        raise InputError(f"{region.name} is a line; its growth says nothing, choose a closed region")
    return shape


def _one_frame(bench: Workbench, settings: FigureSettings) -> Field:
    frames = bench.frames(settings.frames)
    if len(frames) != 1:
        raise InputError(f'frames "{settings.frames}": this kind of figure shows one frame; name one')
    return bench.field(frames[0])


def _along(bench: Workbench, settings: FigureSettings, region: Region, words: tuple[str, str]):
    field = _one_frame(bench, settings)
    found = around(field, region.outline())
    if not np.isfinite(found.tangential).any():
        raise InputError(f"{region.name} is nowhere measured on this frame; choose another frame or region")
    figure, axes = _sheet(settings)
    axes.axhline(0, color=looks.MUTED, lw=Paper(settings).line(0.5))
    axes.plot(found.arc_length, found.tangential, color=_FIRST, label=words[0])
    axes.plot(found.arc_length, found.normal, color=_SECOND, ls=(0, (4, 1.5)), label=words[1])
    axes.set_xlabel(plain(wording.with_unit(f"way along {region.name}", field.units.length)))
    axes.set_ylabel(wording.with_unit("velocity", field.units.velocity))
    axes.legend(
        frameon=False,
        loc="lower left",
        bbox_to_anchor=(0, 1),
        ncols=2,
        handlelength=2.2,
        borderpad=0.2,
        borderaxespad=0.1,
    )
    return _titled(figure, axes, settings)


def _banded(axes, at: np.ndarray, numbers: tuple[Number, ...], settings: FigureSettings) -> None:
    """Values with a band of their combined uncertainty."""
    values = np.array([np.nan if number.value is None else number.value for number in numbers])
    spreads = np.array([np.nan if number.combined is None else number.combined for number in numbers])
    if np.isfinite(spreads).any():
        axes.fill_between(at, values - spreads, values + spreads, color=_FIRST, alpha=0.25, lw=0)
    axes.plot(at, values, color=_FIRST, marker="o", ms=0.28 * settings.font_pt)


def _trace(bench: Workbench, settings: FigureSettings) -> tuple[Trace, str]:
    """Over the frames of the settings; all of them where they name a single one."""
    frames = None if len(bench.frames(settings.frames)) == 1 else settings.frames
    if settings.probe is not None:
        return probe_trace(bench, settings.probe, settings.quantities[0], frames), _FIRST
    line = not any(region.outline().closed for region in bench.session.regions)
    region, place = chosen_region(bench, settings, line=line and settings.region is None)
    names = ("circulation", "line_integral") if settings.number == "circulation" else ("flux", "cross_flow")
    number = names[0] if region.outline().closed else names[1]
    return region_trace(bench, region.name, number, frames), colour_of(region, place)


def _instants(trace: Trace) -> tuple[np.ndarray, str]:
    if np.isfinite(trace.times).all():
        return trace.times, "t [s]"
    return trace.frames, "frame"


def _symbol(trace: Trace) -> str:
    """``Γ`` for the circulation of a region, ``ω`` for a probe of the vorticity."""
    name = trace.label.partition(" ")[0]
    return QUANTITIES[name].symbol if name in QUANTITIES else symbol(name)


def _of(trace: Trace) -> str:
    """``of core``, ``at (0.1, 0.01)``."""
    return trace.label.partition(" ")[2]


def _label(trace: Trace) -> str:
    return wording.with_unit(_symbol(trace), trace.unit)


def _squared(unit: str) -> str:
    """The unit of the square: ``m^2/s`` gives ``m^4/s^2``."""
    if unit == "1":
        return ""
    above, *below = unit.split("/")

    def power(part: str) -> str:
        name, _, times = part.partition("^")
        return f"{name}^{2 * int(times or 1)}"

    return (
        "/".join(power(part) for part in (above, *below) if part != "1")
        if above != "1"
        else ("1/" + "/".join(power(part) for part in below))
    )


def _sheet(settings: FigureSettings):
    from matplotlib.figure import Figure

    height = settings.height_mm or _HEIGHT * settings.width_mm
    figure = Figure(figsize=(settings.width_mm / 25.4, height / 25.4), layout="constrained")
    axes = figure.add_subplot()
    axes.spines[["top", "right"]].set_visible(False)
    return figure, axes


def _titled(figure, axes, settings: FigureSettings, what: str = ""):
    """With the figure's title, and small above the axes what the curve is of."""
    if settings.title:
        figure.suptitle(plain(settings.title), weight="bold", size=settings.font_pt)
    if what:
        axes.set_title(plain(what), loc="left", color=looks.MUTED)
    return figure
