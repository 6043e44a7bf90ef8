"""Frames by name: those of the run by number, and those made of the whole run.

``mean`` is the run's mean, ``fluctuation:3`` frame 3 less it, ``phase:8:2`` the average of the frames in the
third of eight bins of the cycle. They are frames like any other.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.files import UnreadableFrame
from fieldview.session.phase import PhaseAverages, PhaseRule
from fieldview.session.statistics import RunStatistics, fluctuation

MEAN = "mean"
FLUCTUATION = "fluctuation:"
PHASE = "phase:"

Frame = int | str


def parse_frames(spec: str | None, count: int) -> list[Frame]:
    """Frames for a text like ``0:100:5``, ``3``, ``0,4,8``, ``mean``, ``fluctuation:0:10`` or ``phase:8``.

    All frames by number for None; ``phase:8`` is all eight bins, ``phase:8:2`` one of them.

    Raises InputError for any other text and for frames a run of ``count`` frames does not have.
    """
    if spec is None:
        return list(range(count))
    text = spec.strip()
    if text == MEAN:
        return [MEAN]
    if text.startswith(FLUCTUATION):
        return [f"{FLUCTUATION}{number}" for number in _numbers(text.removeprefix(FLUCTUATION), spec, count)]
    if text.startswith(PHASE):
        return _phase_bins(text.removeprefix(PHASE), spec)
    return _numbers(text, spec, count)


def _numbers(text: str, spec: str, count: int) -> list[int]:
    chosen: list[int] = []
    for part in text.split(","):
        bounds = _whole_numbers(part)
        if not 1 <= len(bounds) <= 3 or bounds == [None] or (len(bounds) == 3 and bounds[2] == 0):
            raise InputError(
                f'frames "{spec}": write a number, start:stop:step, a list with commas, mean, '
                "fluctuation:NUMBER or phase:BINS"
            )
        if len(bounds) == 1:
            chosen.append(bounds[0])
        else:
            # Only what the run has: 0:100 on a run of 48 frames is the run
            chosen.extend(range(count)[slice(*bounds)])
    wrong = [frame for frame in chosen if not 0 <= frame < count]
    if wrong or not chosen:
        which = f"frame {wrong[0]}" if wrong else f'frames "{spec}"'
        raise InputError(f"{which}: the run has {count} frames, 0 to {count - 1}")
    return chosen


def _phase_bins(text: str, spec: str) -> list[str]:
    bounds = _whole_numbers(text)
    if len(bounds) not in (1, 2) or None in bounds or bounds[0] < 1:
        raise InputError(f'frames "{spec}": write phase:BINS, such as phase:8, or phase:BINS:NUMBER')
    bins, *chosen = bounds
    if chosen and not 0 <= chosen[0] < bins:
        raise InputError(f'frames "{spec}": the bins of the cycle are 0 to {bins - 1}')
    return [f"{PHASE}{bins}:{number}" for number in chosen or range(bins)]


def _whole_numbers(text: str) -> list[int | None]:
    """Whole numbers between colons, None where one is left out; nothing where something else stands."""
    try:
        return [int(part) if part.strip() else None for part in text.split(":")]
    except ValueError:
        return []


@dataclass(frozen=True)
class WholeRun:
    """Where frames made of the whole run come from.

    Attributes
    ----------
    frames : int
    frame : callable (number) -> Field
    rule : callable (bins) -> PhaseRule
        The session's; raises InputError where it does not say what the phase is.
    keep : callable (name, make) -> made
        What was made under this name before, or what ``make()`` makes now.
    """

    frames: int
    frame: Callable[[int], Field]
    rule: Callable[[int], PhaseRule]
    keep: Callable[[str, Callable], object]

    def made(self, name: str) -> Field:
        """The frame of this name, as `parse_frames` gives them."""
        if name == MEAN:
            return self._mean
        if name.startswith(FLUCTUATION):
            number = int(name.removeprefix(FLUCTUATION))
            return fluctuation(self.frame(number), self._mean, self.frames)
        bins, number = (int(part) for part in name.removeprefix(PHASE).split(":"))
        return self.keep(f"{PHASE}{bins}", lambda: self._averages(bins))[number]()

    @property
    def _mean(self) -> Field:
        return self.keep(MEAN, self._make_mean)

    def _make_mean(self) -> Field:
        run, left_out = RunStatistics(lags=1), []
        for _, field in self._readable(left_out):
            run.add(field)
        return _with_notes(run.mean, left_out)

    def _averages(self, bins: int) -> list[Callable[[], Field]]:
        """One for every bin; a bin without frames says so when it is asked for, and not before."""
        averages, left_out = PhaseAverages(self.rule(bins)), []
        for _, field in self._readable(left_out):
            averages.add(field)
        return [lambda number=n: _with_notes(averages.field(number), left_out) for n in range(bins)]

    def _readable(self, left_out: list[str]) -> Iterator[tuple[int, Field]]:
        """The frames one by one; those that cannot be read are left out, unless none can."""
        error = None
        for number in range(self.frames):
            try:
                field = self.frame(number)
            except UnreadableFrame as said:
                left_out.append(f"{LEFT_OUT}{number}: {said}")
                error = said
            else:
                yield number, field
        if error is not None and len(left_out) == self.frames:
            raise error


LEFT_OUT = "left out frame "
"""How the note on a field begins that tells of a frame it was to be made of and could not."""


def left_out(notes: Iterable[str]) -> list[str]:
    """The notes that tell of frames that were left out."""
    return [note for note in notes if note.startswith(LEFT_OUT)]


def _with_notes(field: Field, notes: list[str]) -> Field:
    return field.with_(notes=(*field.notes, *notes)) if notes else field
