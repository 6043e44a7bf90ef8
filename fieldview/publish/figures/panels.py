"""The panels of a map: which frame and quantity each shows, and the colours they share."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.quantities import QUANTITIES, quantity
from fieldview.publish import looks, wording
from fieldview.session.figures import FigureSettings
from fieldview.session.replay import Frame, Workbench


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


def panel_title(panel: Panel, panels: list[Panel]) -> str:
    """What tells a panel from the others."""
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
