"""Statistics of a run: its mean and fluctuation as frames like any other, the rest as named maps.

Frames are replayed one by one and let go again. Partial results of neighbouring stretches of a run merge to
what one pass gives, so that a run can be shared out.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import replace

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.filling import FillMap
from fieldview.compute.lag_window import LAGS
from fieldview.compute.quantities import quantity_map
from fieldview.compute.statistics import FrameStatistics, StatisticMap, statistic_maps
from fieldview.session.clock import Clock
from fieldview.session.wording import known_number

STRETCH = 128
"""Frames of a stretch. Always the same, so that the last digit does not depend on how many share the work."""


class RunStatistics:
    """Statistics of the frames added so far, all on one grid.

    Parameters
    ----------
    filled : bool
        Count filled vectors as samples; they are left out otherwise.
    lags : int
        Longest lag of the autocorrelation behind the uncertainties. [frames]
    """

    def __init__(self, *, filled: bool = False, lags: int = LAGS):
        self.filled, self.lags = filled, lags
        self.frames, self.skipped = 0, 0
        self.clock = Clock()
        self._first: Field | None = None
        self._last: Field | None = None
        self._sums: FrameStatistics | None = None
        self._leading = 0

    def add(self, field: Field) -> None:
        """The next frame in time."""
        if self._first is None:
            self._begin(field)
        if not field.grid.same_nodes(self._first.grid):
            raise InputError("statistics need all frames on one grid; leave the frames of another grid out")
        wanted = field.valid if self.filled else field.status == Status.MEASURED
        parts = {name: np.where(wanted, part, np.nan) for name, part in field.components.items()}
        self._sums.add(parts, noise_variance=self._noise(field))
        for name, total in self._stated.items():
            total += np.where(wanted, field.error.sigma_of(name, wanted.shape) ** 2, 0.0)
        self._masked &= field.status == Status.MASKED
        self._last = field
        self.frames += 1
        self.clock.add(field.time)

    def skip(self) -> None:
        """A frame that could not be read: it counts as a gap in time."""
        self.skipped += 1
        self.clock.skip()
        if self._sums is None:
            self._leading += 1
        else:
            self._sums.add({name: np.full(self._masked.shape, np.nan) for name in self._sums.names})

    def merge(self, later: RunStatistics) -> None:
        """The statistics of the stretch of the run that follows directly; ``later`` is used up."""
        if (later.filled, later.lags) != (self.filled, self.lags):
            raise InputError("statistics made with other choices cannot be merged")
        if later._first is None:
            for _ in range(later.skipped):
                self.skip()
            return
        if self._first is None:
            self.clock.merge(later.clock)
            before = {"clock": self.clock, "skipped": self.skipped + later.skipped}
            self.__dict__.update(later.__dict__, **before, _leading=self._leading + later._leading)
            return
        for _ in range(later._leading):
            self._sums.add({name: np.full(self._masked.shape, np.nan) for name in self._sums.names})
        self._sums.merge(later._sums)
        for name, total in self._stated.items():
            total += later._stated[name]
        self._masked &= later._masked
        self._last = later._last
        self.frames += later.frames
        self.skipped += later.skipped
        self.clock.merge(later.clock)

    @property
    def count(self) -> np.ndarray:
        """Samples behind each node, int ndarray (ny, nx)."""
        return self._known.moments.count

    @property
    def mean(self) -> Field:
        """The mean of the vectors counted, as a frame.

        The random uncertainty of a node is that of its mean, errors taken as independent from frame to
        frame; how unsteady the flow is stands in the map of mean_u. Systematic errors are common to all
        frames and do not average out.
        """
        sums, first = self._known, self._first
        some = self.count > 0
        status = np.where(some, Status.MEASURED, np.where(self._masked, Status.MASKED, Status.MISSING))
        parts = {name: sums.moments.mean(name) for name in sums.names}
        per_node = np.maximum(self.count, 1)
        sigma = {name: np.sqrt(total) / per_node for name, total in self._stated.items()} or None
        return first.with_(
            **parts,
            status=status.astype(np.uint8),
            measured=parts,
            channels={},
            channel_units={},
            time=None,
            maps=tuple(change for change in self._last.maps if not isinstance(change, FillMap)),
            events=(),
            error=replace(first.error, sigma=sigma),
            notes=(*first.notes, *self._mean_notes(some)),
        )

    def fluctuation(self, field: Field, *, mean: Field | None = None) -> Field:
        """One frame less the mean, as a frame; nodes that have no mean are missing.

        Its random errors are those of the frame; the mean's own are smaller by the root of its frames.
        """
        return fluctuation(field, self.mean if mean is None else mean, self.frames)

    def maps(self, *, subtract_noise: bool = False) -> dict[str, StatisticMap]:
        """Every statistic by name, see `fieldview.compute.statistics.statistic_maps`."""
        return statistic_maps(self._known, interval=self.clock.interval, subtract_noise=subtract_noise)

    def rows(self, *, subtract_noise: bool = False, points: Iterable[tuple[float, float]] = ()) -> list[dict]:
        """One row for every statistic, in strict JSON: median, range and median uncertainty over the nodes.

        With ``points`` (plane coordinates) the value at the node nearest to each is there as well.
        """
        maps = self.maps(subtract_noise=subtract_noise)
        units, grid = self._first.units, self._first.grid
        nodes = [_nearest(grid, point) for point in points]
        return [_row(entry, entry.unit(units), grid, nodes) for entry in maps.values()]

    def remarks(self) -> list[str]:
        """What is to be known of the sample as a whole."""
        said = self._mean_notes(self.count > 0)[1:]
        if self.filled:
            said.append("filled vectors are counted as samples")
        if self.skipped:
            said.append(f"{self.skipped} frames could not be used and are gaps in time")
        return [*said, *self.clock.remarks()]

    def _begin(self, field: Field) -> None:
        shape, names = field.grid.shape, tuple(field.components)
        self._first = field
        self._sums = FrameStatistics(names, shape, lags=self.lags)
        known = [name for name in names if field.error.sigma_of(name, shape) is not None]
        self._stated = {name: np.zeros(shape) for name in known}
        self._masked = np.ones(shape, bool)

    def _noise(self, field: Field) -> dict[str, np.ndarray]:
        """Variance of the errors of the values as they are, after filling and smoothing."""
        shape, changed = (
            field.grid.shape,
            [m for m in field.maps if self.filled or not isinstance(m, FillMap)],
        )
        variances = {}
        for name in self._stated:
            sigma = field.error.sigma_of(name, shape)
            if changed:
                sigma = quantity_map(field, name).uncertainty
            if sigma is not None:
                variances[name] = sigma**2
        return variances

    def _mean_notes(self, some: np.ndarray) -> list[str]:
        notes = [f"mean over {self.frames} frames, noise taken as independent between them"]
        fewest = int(self.count[some].min()) if some.any() else 0
        if fewest < self.frames:
            left_out = "rejected vectors" if self.filled else "filled and rejected vectors"
            notes.append(f"{left_out} left out: the fewest frames behind a node are {fewest}")
        return notes

    @property
    def _known(self) -> FrameStatistics:
        if self._sums is None:
            raise InputError("the run has no frames to take a mean of")
        return self._sums


def statistics_of(fields: Iterable[Field], *, filled: bool = False, lags: int = LAGS) -> RunStatistics:
    """Statistics of frames given in order of time, taken one at a time."""
    run = RunStatistics(filled=filled, lags=lags)
    for field in fields:
        run.add(field)
    return run


def run_statistics(
    bench,
    frames: Iterable[int] | str | None = None,
    *,
    filled: bool = False,
    lags: int = LAGS,
    on_skip: Callable[[int, InputError], None] | None = None,
    on_frame: Callable[[int], None] | None = None,
) -> RunStatistics:
    """Statistics of chosen frames of a session's run, after its ledger.

    Parameters
    ----------
    bench : Workbench
    frames : optional
        Numbers, or a text like ``"0:100:5"``; all if left out.
    on_skip : callable (frame, InputError), optional
        Told of a frame that cannot be used, which then counts as a gap; without it the error is raised.
    on_frame : callable (frame), optional
        Told of every frame done; what it raises (a cancelled job) ends the pass.

    Raises
    ------
    InputError
        No frame could be used, or ``frames`` names what is not a frame.
    """
    numbers = frame_numbers(bench, frames)
    run, failures = RunStatistics(filled=filled, lags=lags), []

    def skip(frame: int, error: InputError) -> None:
        if on_skip is None:
            raise error
        on_skip(frame, error)
        failures.append(error)

    for stretch in stretches(numbers):
        run.merge(
            stretch_statistics(bench, stretch, filled=filled, lags=lags, on_skip=skip, on_frame=on_frame)
        )
    if failures and not run.frames:
        raise failures[-1]
    return run


def stretches(numbers: list[int]) -> list[list[int]]:
    """Frames in the stretches that statistics are made of, whoever makes them."""
    return [numbers[start : start + STRETCH] for start in range(0, len(numbers), STRETCH)]


def stretch_statistics(
    bench,
    numbers: Iterable[int],
    *,
    filled: bool,
    lags: int,
    on_skip: Callable[[int, InputError], None],
    on_frame: Callable[[int], None] | None = None,
) -> RunStatistics:
    """Statistics of one stretch of frames: the piece of work that a run is shared out in."""
    run = RunStatistics(filled=filled, lags=lags)
    for frame in numbers:
        try:
            field = bench.field(frame)
        except InputError as error:
            on_skip(frame, error)
            run.skip()
        else:
            run.add(field)
        if on_frame is not None:
            on_frame(frame)
    return run


def frame_numbers(bench, frames: Iterable[int] | str | None) -> list[int]:
    """The numbers of the frames meant; InputError for any that is not a frame of the run itself."""
    chosen = bench.frames(frames) if frames is None or isinstance(frames, str) else list(frames)
    if not all(isinstance(frame, int | np.integer) for frame in chosen):
        raise InputError(f'frames "{frames}": statistics are made of frames by number, such as 0:100:5')
    return [int(frame) for frame in chosen]


def fluctuation(field: Field, mean: Field, frames: int) -> Field:
    """One frame less the mean over so many frames; see `RunStatistics.fluctuation`."""
    lost = field.valid & ~mean.valid
    status = np.where(lost, np.uint8(Status.MISSING), field.status)
    parts = {name: part - getattr(mean, name) for name, part in field.components.items()}
    measured = {name: field.measured[name] - getattr(mean, name) for name in parts}
    notes = (*field.notes, f"fluctuation about the mean over {frames} frames")
    return field.with_(**parts, status=status, measured=measured, notes=notes)


# --- rows ------------------------------------------------------------------------------------------


def _nearest(grid, point: tuple[float, float]) -> tuple[int, int]:
    place = np.unravel_index(np.argmin(np.abs(grid.nodes - complex(*point))), grid.shape)
    return int(place[0]), int(place[1])


def _row(entry: StatisticMap, unit: str, grid, nodes) -> dict:
    known = entry.values[np.isfinite(entry.values)]
    row = {
        "name": entry.name,
        "title": entry.title,
        "unit": unit,
        "nodes": int(known.size),
        "median": known_number(np.median(known)) if known.size else None,
        "lowest": known_number(known.min()) if known.size else None,
        "highest": known_number(known.max()) if known.size else None,
        "median_uncertainty": _median(entry.uncertainty),
        "remarks": list(entry.remarks),
    }
    if nodes:
        row["points"] = [_at(entry, grid, node) for node in nodes]
    return row


def _at(entry: StatisticMap, grid, node: tuple[int, int]) -> dict:
    place = grid.nodes[node]
    uncertainty = None if entry.uncertainty is None else known_number(entry.uncertainty[node])
    return {
        "node": list(node),
        "place": [float(place.real), float(place.imag)],
        "value": known_number(entry.values[node]),
        "uncertainty": uncertainty,
    }


def _median(values: np.ndarray | None) -> float | None:
    known = np.array([]) if values is None else values[np.isfinite(values)]
    return known_number(np.median(known)) if known.size else None
