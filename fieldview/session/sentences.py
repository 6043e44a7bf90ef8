"""One plain sentence for each kind of ledger line."""

from __future__ import annotations

from collections.abc import Callable

from fieldview.session import steps
from fieldview.session.wording import figure


def sentence(step: steps.Step) -> str:
    """What a line is, in plain words, without what it did."""
    return _SENTENCES[type(step)](step)


def _say_calibrate(step):
    x, y = (1e3 * scale for scale in step.scale)
    scale = figure(x) if x == y else f"{figure(x)} × {figure(y)}"
    return f"Calibrate {scale} mm/px, pulse separation {figure(1e3 * step.pulse_separation)} ms"


def _say_turn(step):
    parts = [f"turned by {figure(step.angle_deg)}°"] if step.angle_deg else []
    parts += [f"{step.reflect} reversed"] if step.reflect else []
    parts += [f"shifted by ({figure(step.shift[0])}, {figure(step.shift[1])})"] if any(step.shift) else []
    return "Axes " + (", ".join(parts) or "as they are")


def _say_moving(step):
    parts = {"frame": ["with the frame's mean"], "run": ["with the run's mean"]}.get(step.mean, [])
    if step.mean is None:
        parts = [f"with ({figure(step.velocity[0])}, {figure(step.velocity[1])})"]
    parts += [f"turning at {figure(step.rotation)} rad per unit of time"] if step.rotation else []
    return "Moving frame " + ", ".join(parts)


def _say_mask(step):
    side = "inside" if step.keep == "outside" else "outside"
    if step.channel is not None:
        return f"Mask where {step.channel} is {_bounds(step.at_least, step.at_most, 'at least', 'at most')}"
    return f"Mask {side} a {step.region.shape}" + (", moving" if step.motion else "")


def _say_range(step):
    def span(limit):
        low, high = (
            ("−∞" if limit[0] is None else figure(limit[0])),
            ("∞" if limit[1] is None else figure(limit[1])),
        )
        return f"{low} … {high}"

    parts = [
        f"{name} {span(getattr(step, name))}" for name in ("u", "v", "w", "speed") if getattr(step, name)
    ]
    return "Range test " + (", ".join(parts) or "without limits")


def _bounds(at_least, at_most, low_word, high_word) -> str:
    parts = [f"{low_word} {figure(at_least)}"] if at_least is not None else []
    parts += [f"{high_word} {figure(at_most)}"] if at_most is not None else []
    return " or ".join(parts)


def _say_quality(step):
    return f"Quality test, {step.channel} {_bounds(step.at_least, step.at_most, 'at least', 'at most')}"


def _say_median(step):
    passes = f", {step.passes} passes" if step.passes > 1 else ""
    return f"Median test, radius {step.radius}, threshold {figure(step.threshold)}{passes}"


def _say_hand(step):
    return f"By hand: {len(step.reject)} to reject, {len(step.keep)} to keep"


def _say_fill(step):
    limit = f", gaps up to {step.max_gap} nodes" if step.max_gap is not None else ""
    return f"Fill, {step.method.replace('_', ' ')}{limit}"


def _say_smooth(step):
    width = f", {figure(step.width)} nodes" if step.width is not None else ""
    return f"Smooth, {step.method.replace('_', '–').capitalize()}{width}"


_SENTENCES: dict[type, Callable] = {
    steps.Calibrate: _say_calibrate,
    steps.TurnAxes: _say_turn,
    steps.MovingFrame: _say_moving,
    steps.Mask: _say_mask,
    steps.RangeTest: _say_range,
    steps.QualityTest: _say_quality,
    steps.MedianTest: _say_median,
    steps.SpreadTest: lambda step: f"Spread test, limit {figure(step.limit)} × 1.4826 MAD",
    steps.TimeTest: lambda step: (
        f"Time test, {step.half_window} frames either side, limit {figure(step.limit)}"
    ),
    steps.HandEdit: _say_hand,
    steps.Fill: _say_fill,
    steps.Smooth: _say_smooth,
}
