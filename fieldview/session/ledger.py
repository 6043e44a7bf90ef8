"""What each ledger line does to one frame, and the sentence that says so."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from fieldview.compute import axes, filling, smoothing, validation
from fieldview.compute.errors import InputError
from fieldview.compute.field import Event, Field, Status
from fieldview.session import steps
from fieldview.session.sentences import sentence
from fieldview.session.wording import figure


class Neighbours(Protocol):
    """What a step may ask about the rest of the run, as of the line before its own."""

    frame: int
    rows_downward: bool

    def stack(self, half_window: int) -> list[Field]:
        """The fields of the frames around this one, this one among them."""

    def run_mean(self) -> complex:
        """Mean velocity u + iv over all measured vectors of the run."""

    def noise(self) -> dict[str, float]:
        """Noise level per component: sigma where stated, else estimated from the run."""


@dataclass(frozen=True)
class Tally:
    """What one line did to one frame.

    Attributes
    ----------
    line : int
        Index in the ledger.
    step : str
    sentence : str
        What the line is, in plain words.
    outcome : str
        What it did to this frame, in plain words; "switched off" where it is off.
    counts : dict of str to int
        Number of vectors by what became of them.
    seconds : float
        Time the line took; 0 where it came from the cache.
    """

    line: int
    step: str
    sentence: str
    outcome: str
    counts: dict[str, int]
    seconds: float = 0.0


def apply_line(field: Field, line: int, step: steps.Step, around: Neighbours) -> tuple[Field, Tally]:
    """The field after one ledger line, and the tally of what it did."""
    after, remark = _APPLY[type(step)](field, line, step, around)
    counts = _counts(field, after)
    return after, Tally(line, step.step, sentence(step), _outcome(counts, after, remark), counts)


def switched_off(line: int, step: steps.Step) -> Tally:
    return Tally(line, step.step, sentence(step), "switched off", {})


def _counts(before: Field, after: Field) -> dict[str, int]:
    changed = before.status != after.status
    counts = {}
    for status, word in (
        (Status.MASKED, "masked"),
        (Status.REJECTED, "rejected"),
        (Status.FILLED, "filled"),
        (Status.MEASURED, "taken back"),
    ):
        number = int(np.count_nonzero(changed & (after.status == status)))
        if number:
            counts[word] = number
    for event in after.events[len(before.events) :]:
        if event.action in ("not judged", "left missing"):
            number = int(np.count_nonzero(event.nodes))
            if number:
                counts[event.action] = counts.get(event.action, 0) + number
    return counts


def _outcome(counts: dict[str, int], after: Field, remark: str) -> str:
    total = after.status.size
    words = [
        f"{number:,} {word}" + (f" ({100 * number / total:.1f} %)" if word in ("rejected", "masked") else "")
        for word, number in counts.items()
    ]
    if remark:
        words.append(remark)
    return ", ".join(words) if words else "nothing changed"


# What each step does: each function gives the field after the line and a remark for its outcome.


def _calibrate(field, line, step, around):
    column, row = step.origin
    after = axes.calibrate(
        field,
        metres_per_pixel=step.scale,
        pulse_separation=step.pulse_separation,
        # the origin is a pixel of the file; where its rows run downward, reading has turned them over
        origin=(column, -row if around.rows_downward else row),
    )
    return after, "pixels to metres, pulses to seconds"


def _turn_axes(field, line, step, around):
    after = axes.turn_axes(
        field,
        angle=math.radians(step.angle_deg),
        about=complex(*step.about),
        reflect=step.reflect,
        shift=complex(*step.shift),
    )
    flips = "vorticity changes sign" if step.reflect else "vorticity keeps its sign"
    return after, flips


def _moving_frame(field, line, step, around):
    if step.mean == "frame":
        after = axes.remove_mean(field)
        taken = _mean_velocity(field)
    else:
        taken = around.run_mean() if step.mean == "run" else complex(*step.velocity)
        after = field
    if step.mean != "frame" or step.rotation:
        after = axes.moving_frame(
            after,
            velocity=0j if step.mean == "frame" else taken,
            rotation=step.rotation,
            about=complex(*step.about),
        )
    unit = field.units.velocity
    return after, f"({figure(taken.real)}, {figure(taken.imag)}) {unit} taken away"


def _mask(field, line, step, around):
    if step.channel is not None:
        values = _channel(field, step.channel)
        nodes = np.zeros(values.shape, bool)
        if step.at_least is not None:
            nodes |= values >= step.at_least
        if step.at_most is not None:
            nodes |= values <= step.at_most
    else:
        outline = step.region.outline()
        problem = outline.problem()
        if problem:
            raise InputError(f"ledger[{line}].region: {problem}")
        shift, turn = _keyframed(step.motion, around.frame)
        inside = outline.turned(turn).shifted(shift).contains(field.grid.nodes)
        nodes = inside if step.keep == "outside" else ~inside
    return field.mask(nodes, Event(line, step.step, "masked", nodes)), ""


def _range_test(field, line, step, around):
    limits = {name: getattr(step, name) for name in ("u", "v", "w", "speed")}
    given = {name: limit for name, limit in limits.items() if limit is not None}
    absent = [name for name in given if name != "speed" and name not in field.components]
    if absent:
        raise InputError(f"ledger[{line}]: the run has no component {absent[0]}; remove its limits")
    # the limits are stated along the plane's axes, not the lattice's
    measured = field.status == Status.MEASURED
    parts = {name: np.where(measured, part, np.nan) for name, part in field.components.items()}
    verdict = validation.range_test(**parts, limits=given)
    return _judged(field, line, step, verdict, None), ""


def _quality_test(field, line, step, around):
    if step.at_least is None and step.at_most is None:
        raise InputError(f"ledger[{line}]: a quality test needs at_least or at_most")
    values = np.where(field.status == Status.MEASURED, _channel(field, step.channel), np.nan)
    verdict = validation.quality_test(values, at_least=step.at_least, at_most=step.at_most)
    return _judged(field, line, step, verdict, None), ""


def _median_test(field, line, step, around):
    parts = _measured_parts(field)
    if step.floor is not None:
        floor, remark = {name: step.floor for name in parts}, ""
    else:
        level = around.noise()
        floor = {name: level[name] for name in parts}
        word = "sigma" if field.error.origin in ("given", "from file") else "noise estimated from the run"
        shown = ", ".join(dict.fromkeys(figure(value) for value in floor.values()))
        remark = f"floor {shown} {field.units.velocity} ({word})"
    verdict = validation.median_test(
        **parts, radius=step.radius, threshold=step.threshold, floor=floor, passes=step.passes
    )
    return _judged(field, line, step, verdict, step.threshold), remark


def _spread_test(field, line, step, around):
    verdict = validation.spread_test(**_measured_parts(field), limit=step.limit)
    return _judged(field, line, step, verdict, step.limit), ""


def _time_test(field, line, step, around):
    fields = around.stack(step.half_window)
    parts = [_measured_parts(other) for other in fields]
    stacks = {name: np.stack([part[name] for part in parts]) for name in parts[0]}
    verdict = validation.time_test(_measured_parts(field), stacks, limit=step.limit)
    remark = "" if len(fields) == 2 * step.half_window + 1 else f"only {len(fields)} frames in reach"
    return _judged(field, line, step, verdict, step.limit), remark


def _hand_edit(field, line, step, around):
    rejected, kept = (_picked(field, line, list_, around.frame) for list_ in (step.reject, step.keep))
    after = field.reject(rejected, Event(line, step.step, "rejected", rejected & field.valid))
    back = kept & (after.status == Status.REJECTED)
    return after.restored(back, Event(line, step.step, "kept", back)), ""


def _fill(field, line, step, around):
    wanted = (field.status == Status.MISSING) | (field.status == Status.REJECTED)
    result = filling.fill_map(
        field.grid,
        field.valid,
        wanted,
        method=step.method,
        max_gap=step.max_gap,
        values=field.lattice_components(),
    )
    after = field.mapped(result, np.where(result.filled, Status.FILLED, field.status))
    events = [Event(line, step.step, "filled", result.filled)]
    if result.left.any():
        events.append(Event(line, step.step, "left missing", result.left))
    return after.with_(events=(*field.events, *events)), ""


def _smooth(field, line, step, around):
    result = smoothing.smoothing_map(
        field.grid, field.valid, method=step.method, width=step.width, values=field.lattice_components()
    )
    return field.mapped(result, field.status), f"{np.count_nonzero(field.valid):,} smoothed"


def _measured_parts(field: Field) -> dict[str, np.ndarray]:
    """Components on the lattice's axes, NaN where the node is not MEASURED: a test judges only those."""
    measured = field.status == Status.MEASURED
    if measured.all():
        return field.lattice_components()
    return {name: np.where(measured, part, np.nan) for name, part in field.lattice_components().items()}


def _judged(field, line, step, verdict, limit) -> Field:
    event = Event(line, step.step, "rejected", verdict.rejected, verdict.residual, limit)
    after = field.reject(verdict.rejected, event)
    not_judged = verdict.not_judged & (field.status == Status.MEASURED)
    if not_judged.any():
        unjudged = Event(line, step.step, "not judged", not_judged)
        after = after.with_(events=(*after.events, unjudged))
    return after


def _channel(field: Field, name: str) -> np.ndarray:
    if name not in field.channels:
        known = ", ".join(field.channels) or "none"
        raise InputError(f'the run has no channel "{name}"; its channels are: {known}')
    return field.channels[name]


def _picked(field: Field, line: int, entries, frame: int) -> np.ndarray:
    nodes = np.zeros(field.grid.shape, bool)
    for number, iy, ix in entries:
        if iy >= nodes.shape[0] or ix >= nodes.shape[1]:
            raise InputError(
                f"ledger[{line}]: vector [{number}, {iy}, {ix}] is outside the lattice of "
                f"{nodes.shape[0]} rows and {nodes.shape[1]} columns"
            )
        if number == frame:
            nodes[iy, ix] = True
    return nodes


def _keyframed(motion, frame: int) -> tuple[complex, float]:
    """Shift and turn [rad] of a moving mask at a frame; held beyond the first and last keyframe."""
    if not motion:
        return 0j, 0.0
    frames, dx, dy, angle = (np.array(column) for column in zip(*motion, strict=True))
    at = [float(np.interp(frame, frames, column)) for column in (dx, dy, angle)]
    return complex(at[0], at[1]), math.radians(at[2])


def _mean_velocity(field: Field) -> complex:
    u, v = (np.nanmean(part) if part is not None else 0.0 for part in (field.u, field.v))
    return complex(u, v)


_APPLY: dict[type, Callable] = {
    steps.Calibrate: _calibrate,
    steps.TurnAxes: _turn_axes,
    steps.MovingFrame: _moving_frame,
    steps.Mask: _mask,
    steps.RangeTest: _range_test,
    steps.QualityTest: _quality_test,
    steps.MedianTest: _median_test,
    steps.SpreadTest: _spread_test,
    steps.TimeTest: _time_test,
    steps.HandEdit: _hand_edit,
    steps.Fill: _fill,
    steps.Smooth: _smooth,
}
