"""Phase averages of a run: one frame for every bin of the cycle.

The phase of a frame is read from a channel of the run or follows from a stated frequency and the frame's
time. Frames of one bin do not all have its phase: how far they scatter, and how much of a variation
once per cycle that smears away, is said for every bin.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from dataclasses import field as attribute

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.session.statistics import RunStatistics, frame_numbers
from fieldview.session.wording import figure, known_number

CYCLE = {"deg": 360.0, "rad": 2 * np.pi, "1": 1.0}
"""A whole cycle in the units a phase channel may have."""

_LAGS = 4
_ON_EDGE = 1e-9
"""Share of a bin within which a phase counts as on its edge."""

_ONE_PHASE = 0.01
"""Largest spread of the phase channel over the nodes of one frame. [cycles]"""


@dataclass(frozen=True)
class PhaseRule:
    """Where the phase of a frame comes from, and the bins of the cycle.

    Attributes
    ----------
    bins : int
        Bins, evenly spread over the cycle, the first centred on phase 0.
    channel : str or None
        Channel that holds the phase.
    unit : "deg", "rad" or "1"
        Of the channel; "1" is cycles.
    frequency, u_frequency : float or None
        Of the cycle, phase 0 at time 0, and its standard uncertainty. [1/s]
    width : float or None
        Of a bin; bins that touch if left out. Frames between narrower bins are left out. [cycles]
    """

    bins: int
    channel: str | None = None
    unit: str = "deg"
    frequency: float | None = None
    u_frequency: float | None = None
    width: float | None = None

    def __post_init__(self):
        if self.bins < 1:
            raise InputError(f"phase averages are asked in {self.bins} bins; give one or more")
        if (self.channel is None) == (self.frequency is None):
            raise InputError("a phase average needs either a phase channel or a frequency, one of them")
        if self.unit not in CYCLE:
            raise InputError(f'the unit of the phase is "{self.unit}"; write deg, rad, or 1 for cycles')
        if self.frequency is not None and not self.frequency > 0:
            raise InputError(f"the frequency of the phase average is {self.frequency}; give a positive one")
        if self.width is not None and not 0 < self.width <= 1 / self.bins:
            raise InputError(
                f"the width of a phase bin is {figure(self.width)} cycles; {self.bins} bins leave room "
                f"for {figure(1 / self.bins)} at most"
            )

    @property
    def bin_width(self) -> float:
        """[cycles]"""
        return 1 / self.bins if self.width is None else self.width

    def phase(self, frame: Field) -> float:
        """Phase of a frame, in [0, 1). [cycles]"""
        if self.channel is None:
            if frame.time is None:
                raise InputError(
                    "phase averages by a frequency need the times of the frames; "
                    "state the frame interval, or use a phase channel"
                )
            return float(self.frequency * frame.time % 1.0)
        if self.channel not in frame.channels:
            known = ", ".join(frame.channels) or "none"
            raise InputError(f'the run has no channel "{self.channel}"; its channels are: {known}')
        values = np.asarray(frame.channels[self.channel], float) / CYCLE[self.unit]
        turns = np.exp(2j * np.pi * values[np.isfinite(values)])
        if not turns.size or np.abs(turns - turns.mean()).max() > 2 * np.pi * _ONE_PHASE:
            raise InputError(
                f'channel "{self.channel}" is not one phase over the frame; '
                "a phase channel has the same value at every node"
            )
        return float(np.angle(turns.mean()) / (2 * np.pi) % 1.0)

    def bin_of(self, phase: float) -> tuple[int, float] | None:
        """Number of the bin that holds a phase and the distance from its centre [cycles], or None."""
        # a frame on the edge of two bins goes to the one above, whatever rounding did to its phase
        number = math.floor(phase * self.bins + 0.5 + _ON_EDGE)
        offset = phase - number / self.bins
        edge = _ON_EDGE / self.bins
        inside = -0.5 * self.bin_width - edge <= offset < 0.5 * self.bin_width - edge
        # touching bins share their edges' rounding; nothing may fall between them
        return (number % self.bins, offset) if inside or self.width is None else None


@dataclass
class PhaseBin:
    """One bin of the cycle: its statistics, and the phases that came into it."""

    centre: float
    statistics: RunStatistics
    offsets: list[float] = attribute(default_factory=list)
    times: list[float] = attribute(default_factory=list)

    @property
    def shift(self) -> float:
        """Mean distance of its frames from the centre. [cycles]"""
        return float(np.mean(self.offsets)) if self.offsets else float("nan")

    @property
    def jitter(self) -> float:
        """Standard deviation of its frames' phases. [cycles]"""
        return float(np.std(self.offsets)) if self.offsets else float("nan")

    def kept(self, harmonic: int = 1) -> float:
        """Share of a variation with this many periods per cycle that averaging over the bin leaves."""
        if not self.offsets:
            return float("nan")
        return float(abs(np.mean(np.exp(2j * np.pi * harmonic * np.array(self.offsets)))))


class PhaseAverages:
    """Phase averages of the frames added so far.

    Attributes
    ----------
    bins : list of PhaseBin
    left_out : int
        Frames between the bins.
    """

    def __init__(self, rule: PhaseRule, *, filled: bool = False):
        self.rule, self.left_out = rule, 0
        self.bins = [
            PhaseBin(number / rule.bins, RunStatistics(filled=filled, lags=_LAGS))
            for number in range(rule.bins)
        ]

    def add(self, frame: Field) -> None:
        found = self.rule.bin_of(self.rule.phase(frame))
        if found is None:
            self.left_out += 1
            return
        number, offset = found
        self.bins[number].statistics.add(frame)
        self.bins[number].offsets.append(offset)
        if frame.time is not None:
            self.bins[number].times.append(frame.time)

    def field(self, number: int) -> Field:
        """The average of one bin, as a frame like any other."""
        if not 0 <= number < self.rule.bins:
            raise InputError(f"phase bin {number} does not exist; the bins are 0 to {self.rule.bins - 1}")
        chosen = self.bins[number]
        if not chosen.offsets:
            raise InputError(
                f"no frame falls into the phase bin at {figure(360 * chosen.centre)}°; "
                "use fewer or wider bins"
            )
        mean = chosen.statistics.mean
        return mean.with_(notes=(*mean.notes, *self._notes(chosen)))

    def rows(self) -> list[dict]:
        """One row for every bin, in strict JSON."""
        return [
            {
                "bin": number,
                "phase_deg": 360 * chosen.centre,
                "width_deg": 360 * self.rule.bin_width,
                "frames": len(chosen.offsets),
                "shift_deg": known_number(360 * chosen.shift),
                "jitter_deg": known_number(360 * chosen.jitter),
                "first_harmonic_kept": known_number(chosen.kept()),
                "drift_deg": self._drift(chosen),
            }
            for number, chosen in enumerate(self.bins)
        ]

    def _drift(self, chosen: PhaseBin) -> float | None:
        """What the uncertainty of the stated frequency makes of the phases, over the times of the bin."""
        if self.rule.u_frequency is None or not chosen.times:
            return None
        return float(360 * self.rule.u_frequency * np.std(chosen.times))

    def _notes(self, chosen: PhaseBin) -> list[str]:
        notes = [
            f"phase {figure(360 * chosen.centre)}° ± {figure(180 * self.rule.bin_width)}°: "
            f"{len(chosen.offsets)} frames, {figure(360 * chosen.shift, 2)}° from its centre on the mean, "
            f"jitter {figure(360 * chosen.jitter, 2)}°; {figure(100 * chosen.kept(), 3)} % of a variation "
            "once per cycle is kept"
        ]
        drift = self._drift(chosen)
        if drift:
            notes.append(f"the stated frequency is uncertain by {figure(drift, 2)}° of phase over the run")
        elif self.rule.channel is None and drift is None:
            notes.append("the uncertainty of the frequency is not stated, so the phase's drift is unknown")
        return notes


def phase_averages(
    bench,
    rule: PhaseRule,
    frames: Iterable[int] | str | None = None,
    *,
    filled: bool = False,
    on_frame: Callable[[int], None] | None = None,
) -> PhaseAverages:
    """Phase averages of chosen frames of a session's run, after its ledger, read one by one."""
    averages = PhaseAverages(rule, filled=filled)
    for number in frame_numbers(bench, frames):
        averages.add(bench.field(number))
        if on_frame is not None:
            on_frame(number)
    return averages
