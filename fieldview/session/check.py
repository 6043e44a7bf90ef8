"""Run check: whether the run is good, from one pass over its frames.

What is looked at are the measured values themselves, before filling and smoothing, at the vectors that the
ledger kept; shares count every node that is not masked. The verdicts are in `fieldview.session.findings`.
"""

from __future__ import annotations

import contextlib
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from dataclasses import field as attribute

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.moments import Moments
from fieldview.compute.noise import estimate_sigma
from fieldview.compute.noise_from_divergence import divergence_noise
from fieldview.compute.noise_in_time import NoiseInTime
from fieldview.compute.peak_locking import FractionHistogram, Locking
from fieldview.compute.units import PIXEL
from fieldview.session.findings import Finding, findings
from fieldview.session.statistics import frame_numbers

LOOKED_AT = 16
"""Frames, spread over the run, of which spatial noise and divergence are taken."""


@dataclass(frozen=True)
class FrameLook:
    """Counts of one frame over its nodes that are not masked, and its median vector.

    Attributes
    ----------
    frame : int
    time : float or None
    nodes, measured, rejected, missing, masked : int
        ``nodes`` are those not masked; a vector that was rejected and then filled counts as rejected.
    repeated : float or None
        Share of vectors that are the same as in the frame before.
    median : dict of component name to float or None
        [velocity]
    """

    frame: int
    time: float | None
    nodes: int
    measured: int
    rejected: int
    missing: int
    masked: int
    repeated: float | None
    median: dict[str, float | None]

    @property
    def share(self) -> float:
        """Measured and kept, of the nodes not masked."""
        return self.measured / self.nodes if self.nodes else 0.0


@dataclass(frozen=True, eq=False)
class RunCheck:
    """Everything the check found.

    Attributes
    ----------
    names : tuple of str
        Components.
    unit : str
        Of velocity.
    frames : tuple of FrameLook
    skipped : tuple of (int, str)
        Frames that could not be used, and why.
    measured, rejected : ndarray (ny, nx)
        Share of the frames in which a node was measured and kept, and rejected, among those where it was
        not masked; NaN where it always was. ``rejected`` is the outlier map.
    repeats : ndarray (ny, nx)
        Share of frames in which a vector was the same as in the frame before.
    deviation : dict of component name to ndarray (ny, nx)
        Standard deviation over the frames. [velocity]
    samples : int ndarray (ny, nx)
    locking : dict of component name to Locking
        Empty where the files hold no displacements in pixels.
    sigma : dict of way to dict of component name to float
        "stated", "neighbours", "frames" and "divergence", those that could be had. [velocity]
    resolved : dict of component name to bool
        Whether "frames" is more than an upper bound.
    divergence_ratio : float or None
        Typical divergence over that expected from the stated sigma.
    findings : tuple of Finding
    """

    names: tuple[str, ...]
    unit: str
    frames: tuple[FrameLook, ...]
    skipped: tuple[tuple[int, str], ...]
    measured: np.ndarray
    rejected: np.ndarray
    repeats: np.ndarray
    deviation: dict[str, np.ndarray]
    samples: np.ndarray
    locking: dict[str, Locking]
    sigma: dict[str, dict[str, float]]
    resolved: dict[str, bool]
    divergence_ratio: float | None
    findings: tuple[Finding, ...] = attribute(default=())

    def rows(self) -> list[dict]:
        """One row for every finding, in strict JSON."""
        return [finding.row() for finding in self.findings]

    def frame_rows(self) -> list[dict]:
        """One row for every frame, in strict JSON."""
        return [
            {
                "frame": look.frame,
                "time": look.time,
                "measured": look.share,
                "rejected": look.rejected / look.nodes if look.nodes else None,
                "missing": look.missing / look.nodes if look.nodes else None,
                "masked_nodes": look.masked,
                "repeated": look.repeated,
                "median": dict(look.median),
            }
            for look in self.frames
        ]


@dataclass(frozen=True, eq=False)
class Seen:
    """What the check looks at of one frame: the frame after the ledger and as it was read, or why not.

    Attributes
    ----------
    number : int
    frame : Field or None
    pixels : Field or None
        Displacements as they were read, where the files hold them.
    error : InputError or None
        Why the frame cannot be used.
    """

    number: int
    frame: Field | None = None
    pixels: Field | None = None
    error: InputError | None = None


def seen(bench, number: int) -> Seen:
    """One frame for the check. What was filled and smoothed is not looked at and left behind."""
    try:
        frame = bench.field(number).with_(maps=(), events=())
        return Seen(number, frame, bench.run[number] if bench.run.units == PIXEL else None)
    except InputError as error:
        return Seen(number, error=error)


def run_check(
    bench,
    frames: Iterable[int] | str | None = None,
    *,
    see: Callable[[list[int]], Iterable[Seen]] | None = None,
    on_skip: Callable[[int, InputError], None] | None = None,
    on_frame: Callable[[int], None] | None = None,
) -> RunCheck:
    """Check chosen frames of a session's run, read one by one.

    Parameters
    ----------
    bench : Workbench
    frames : optional
        Numbers, or a text like ``"0:100:5"``; all if left out.
    see : callable (numbers) -> Seen of each in their order, optional
        Who replays the frames; this process by `seen` if left out.
    on_skip : callable (frame, InputError), optional
        Told of a frame that cannot be used; without it the error is raised.
    on_frame : callable (frame), optional
        Told of every frame done; what it raises ends the pass.
    """
    numbers, look, skipped, failure = frame_numbers(bench, frames), None, [], None
    close = set(np.array(numbers)[np.unique(np.linspace(0, len(numbers) - 1, LOOKED_AT).round().astype(int))])
    for one in (seen(bench, number) for number in numbers) if see is None else see(numbers):
        if one.error is not None:
            if on_skip is None:
                raise one.error
            on_skip(one.number, one.error)
            skipped.append((one.number, str(one.error)))
            failure = one.error
            if look is not None:
                look.skip()
        else:
            look = look or _Look(one.frame)
            look.add(one.number, one.frame, one.pixels, closely=one.number in close)
        if on_frame is not None:
            on_frame(one.number)
    if look is None:
        raise failure or InputError("the run has no frames to check")
    return look.result(tuple(skipped))


class _Look:
    """What is gathered frame by frame."""

    def __init__(self, first: Field):
        self.names, self.unit, shape = tuple(first.components), first.units.velocity, first.grid.shape
        self.frames: list[FrameLook] = []
        self._open, self._kept, self._rejected = (np.zeros(shape, np.int64) for _ in range(3))
        self._moments = Moments(self.names, shape)
        self._in_time = NoiseInTime(self.names, shape, correlation=first.error.correlation)
        self._locking = {name: FractionHistogram() for name in self.names if name != "w"}
        self._closely: list[Field] = []
        self._divergence: list = []
        self._stated: dict[str, list[float]] = {}

    def skip(self) -> None:
        self._in_time.skip()

    def add(self, number: int, frame: Field, pixels: Field | None, *, closely: bool) -> None:
        measured = frame.status == Status.MEASURED
        masked = frame.status == Status.MASKED
        came = np.logical_and.reduce([np.isfinite(frame.measured[name]) for name in self.names])
        rejected = (frame.status == Status.REJECTED) | ((frame.status == Status.FILLED) & came)
        parts = {name: np.where(measured, frame.measured[name], np.nan) for name in self.names}
        self._open += ~masked
        self._kept += measured
        self._rejected += rejected
        self._moments.add(parts)
        repeated = self._in_time.add(parts)
        open_nodes = int((~masked).sum())
        self.frames.append(
            FrameLook(
                frame=number,
                time=frame.time,
                nodes=open_nodes,
                measured=int(measured.sum()),
                rejected=int(rejected.sum()),
                missing=open_nodes - int(measured.sum()) - int(rejected.sum()),
                masked=int(masked.sum()),
                repeated=repeated,
                median={
                    n: float(np.median(p[measured])) if measured.any() else None for n, p in parts.items()
                },
            )
        )
        if pixels is not None:
            for name, histogram in self._locking.items():
                histogram.add(np.where(measured, pixels.components[name], np.nan))
        if closely:
            self._look_closely(frame, parts, measured)

    def _look_closely(self, frame: Field, parts, measured) -> None:
        status = np.where(measured, np.uint8(Status.MEASURED), np.uint8(Status.MISSING))
        plain = frame.with_(**parts, status=status, maps=(), events=())
        self._closely.append(plain)
        found = divergence_noise(plain)
        if found is not None:
            self._divergence.append(found)
        for name in self.names:
            sigma = frame.error.sigma_of(name, frame.grid.shape)
            if sigma is not None and frame.error.origin != "estimated":
                self._stated.setdefault(name, []).append(float(np.nanmedian(sigma)))

    def result(self, skipped) -> RunCheck:
        opened = np.where(self._open > 0, self._open, np.nan)
        ratios = [found.ratio for found in self._divergence if found.ratio is not None]
        check = {
            "names": self.names,
            "unit": self.unit,
            "frames": tuple(self.frames),
            "skipped": skipped,
            "measured": self._kept / opened,
            "rejected": self._rejected / opened,
            "repeats": self._in_time.repeats,
            "deviation": {name: self._moments.deviation(name) for name in self.names},
            "samples": self._moments.count,
            "locking": {
                name: found
                for name, found in ((n, h.result()) for n, h in self._locking.items())
                if found.count
            },
            "sigma": self._levels(),
            "resolved": {name: self._in_time.resolved(name) for name in self.names},
            "divergence_ratio": float(np.median(ratios)) if ratios else None,
        }
        return RunCheck(**check, findings=tuple(findings(RunCheck(**check))))

    def _levels(self) -> dict[str, dict[str, float]]:
        levels: dict[str, dict[str, float]] = {}
        if self._stated:
            levels["stated"] = {name: float(np.median(found)) for name, found in self._stated.items()}
        if self._closely:
            # with too few neighbours there is one way less; the finding says which ways there were
            with contextlib.suppress(InputError):
                correlation = self._closely[0].error.correlation
                found = estimate_sigma(self._closely, correlation=correlation)
                levels["neighbours"] = {name: float(level) for name, level in found.items()}
        in_time = {name: self._in_time.level(name) for name in self.names}
        if any(level is not None for level in in_time.values()):
            levels["frames"] = {name: level for name, level in in_time.items() if level is not None}
        if self._divergence:
            implied = float(np.median([found.sigma for found in self._divergence]))
            levels["divergence"] = {"u": implied, "v": implied}
        return levels


def _median(values: np.ndarray) -> float | None:
    return float(np.median(values)) if values.size else None
