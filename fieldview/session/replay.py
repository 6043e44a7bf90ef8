"""Replay of the ledger: from the source files to the field after any of its lines."""

from __future__ import annotations

import hashlib
import threading
import time
from collections import OrderedDict
from dataclasses import replace
from functools import cached_property

import numpy as np

from fieldview.compute.error_model import ErrorModel, Systematic
from fieldview.compute.errors import InputError
from fieldview.compute.field import Event, Field, Status
from fieldview.compute.noise import estimate_sigma
from fieldview.compute.units import Units
from fieldview.files import Run, open_run
from fieldview.session.frames import MEAN, Frame, WholeRun, parse_frames
from fieldview.session.ledger import Tally, apply_line, sentence, switched_off
from fieldview.session.models import Session
from fieldview.session.phase import PhaseRule
from fieldview.session.steps import Calibrate, TimeTest, TurnAxes
from fieldview.session.wording import figure

NOISE_FRAMES = 8
"""Frames looked at where the noise level is estimated from the run, spread evenly over it."""

KEPT_OF_THE_RUN = 8
"""Results that rest on the whole run and are kept: its mean, its noise level, its phase averages."""


def evaluate(session: Session, frame: Frame = 0, *, upto: int | None = None) -> Field:
    """One frame after the ledger, or after its first ``upto`` lines.

    Frame "mean" is the run's mean, "fluctuation:3" is frame 3 less it, "phase:8:0" the first of eight phase
    averages.

    Raises InputError where the run or the session cannot be used.
    """
    return Workbench(session).field(frame, upto=upto)


class Workbench:
    """A session with its run open, and a cache of what its ledger made of the frames.

    Parameters
    ----------
    session : Session
    cache_bytes : int
        How much of the replay is kept. 0 keeps only what a time test needs again at once, so that
        memory does not grow with the number of frames.
    """

    def __init__(
        self,
        session: Session,
        *,
        cache_bytes: int = 0,
        run: Run | None = None,
        before: Workbench | None = None,
    ):
        self.session = session
        self._run = run
        self._shelf = before._shelf if before else _Shelf(cache_bytes)
        self._of_run = before._of_run if before else _Shelf(0)

    def updated(self, session: Session) -> Workbench:
        """The workbench of an edited session; what the edit left alone is not read or computed again."""
        same_run = _run_key(session) == _run_key(self.session)
        return Workbench(session, run=self._run if same_run else None, before=self)

    @property
    def run(self) -> Run:
        if self._run is None:
            source = self.session.run
            self._run = open_run(source.files, source.reading, folder=self.session.folder, store=source.store)
        return self._run

    @property
    def units(self) -> Units:
        """Units of every number of the session."""
        if self.session.units is not None:
            return Units.parse(self.session.units)
        calibrated = any(isinstance(step, Calibrate) and step.on for step in self.session.ledger)
        return Units() if calibrated else self.run.units

    def frames(self, spec: str | None = None) -> list[Frame]:
        """Frames chosen by a text; see `fieldview.session.frames.parse_frames`."""
        return parse_frames(spec, len(self.run))

    def field(self, frame: Frame = 0, *, upto: int | None = None) -> Field:
        """One frame after the ledger, or after its first ``upto`` lines."""
        count = len(self.session.ledger) if upto is None else min(upto, len(self.session.ledger))
        if isinstance(frame, str):
            return self._whole_run(count).made(parse_frames(frame, len(self.run))[0])
        if not 0 <= int(frame) < len(self.run):
            raise InputError(f"frame {frame} does not exist; the run has frames 0 to {len(self.run) - 1}")
        return self._state(int(frame), count)[0].with_(derivative=self.session.derivative)

    def _whole_run(self, count: int) -> WholeRun:
        """What frames of the whole run are made from, after so many lines."""
        key = self._keys[count] + self.session.derivative + str(self.session.phase)

        def keep(name, make):
            return self.of_the_run((name, key), make)

        return WholeRun(len(self.run), lambda number: self.field(number, upto=count), self.phase_rule, keep)

    def phase_rule(self, bins: int) -> PhaseRule:
        """How the session's frames are averaged by phase in so many bins."""
        stated = self.session.phase
        if stated is None:
            raise InputError(
                "the session does not say what the phase of a frame is; "
                'add "phase": {"frequency": 2.0} [1/s] or "phase": {"channel": NAME} to it'
            )
        return PhaseRule(bins, **stated.model_dump())

    def of_the_run(self, key, make):
        """A result that rests on the whole run: kept from before, or made now."""
        found = self._of_run.get(key)
        if found is None:
            found = make()
            self._of_run.put(key, found, needed=KEPT_OF_THE_RUN)
        return found

    def replayed(self, frame: int) -> tuple[Field, tuple[Tally, ...]]:
        """One frame after the ledger, and what every line did to it."""
        field, tallies = self._state(frame, len(self.session.ledger))
        return field.with_(derivative=self.session.derivative), tallies

    def tallies(self, frame: int) -> list[Tally]:
        """What every ledger line did to one frame."""
        return list(self.replayed(frame)[1])

    def changed_sources(self) -> list[str]:
        """A sentence for every source whose digest is not the one the session was saved with."""
        stored = self.session.run.digests
        if not stored:
            return []
        now = self.run.digests()
        return [
            f"{name} has changed since the session was saved"
            if name in now
            else f"{name} was part of the run when the session was saved and is no more"
            for name, digest in stored.items()
            if now.get(name) != digest
        ]

    def with_digests(self) -> Session:
        """The session with the digests of its sources as they are now."""
        run = self.session.run.model_copy(update={"digests": self.run.digests()})
        return self.session.model_copy(update={"run": run})

    # --- replay ---------------------------------------------------------------------------------

    @cached_property
    def _axes_lines(self) -> int:
        """Number of leading lines that place the run in the plane; the error model comes after them."""
        ledger = self.session.ledger
        return next((i for i, s in enumerate(ledger) if not isinstance(s, Calibrate | TurnAxes)), len(ledger))

    @cached_property
    def _keys(self) -> list[str]:
        """For each number of lines a digest of everything the field after them depends on."""
        key, keys = _digest(_run_key(self.session)), []
        for line, step in enumerate((*self.session.ledger, None)):
            if line == self._axes_lines:
                key = _digest(key + self._error_key)
            keys.append(key)
            if step is not None:
                # a line that is off changes nothing, yet its tally is kept by line
                key = _digest(key + step.model_dump_json())
        return keys

    @property
    def _error_key(self) -> str:
        return self.session.error_model.model_dump_json() + str(self.session.units)

    def _state(self, frame: int, count: int) -> tuple[Field, tuple[Tally, ...]]:
        """The field after ``count`` lines and the tally of each of them."""
        start, state = count, None
        while start >= 0:
            state = self._shelf.get((frame, self._keys[start]))
            if state is not None:
                break
            start -= 1
        if state is None:
            start, state = 0, (self._with_error_model_after(0, self.run[frame]), ())
            self._keep(frame, 0, state)
        for line in range(start, count):
            field, tally = self._step(frame, line, state[0])
            state = field, (*state[1], tally)
            self._keep(frame, line + 1, state)
        return state

    def _step(self, frame: int, line: int, field: Field) -> tuple[Field, Tally]:
        step = self.session.ledger[line]
        began = time.perf_counter()
        if step.on:
            field, tally = apply_line(field, line, step, _Around(self, frame, line))
        else:
            tally = switched_off(line, step)
        field = self._with_error_model_after(line + 1, field)
        return field, replace(tally, seconds=time.perf_counter() - began)

    def _keep(self, frame: int, count: int, state) -> None:
        ledger = self.session.ledger
        following = ledger[count] if count < len(ledger) else None
        reach = 2 * following.half_window + 2 if isinstance(following, TimeTest) and following.on else 0
        self._shelf.put((frame, self._keys[count]), state, needed=reach)

    # --- the error model ------------------------------------------------------------------------

    def _with_error_model_after(self, count: int, field: Field) -> Field:
        """The field after ``count`` lines; the error model is stated for the axes those lines lead to."""
        return self._with_error_model(field) if count == self._axes_lines else field

    def _with_error_model(self, field: Field) -> Field:
        stated = self.session.units
        if stated is not None and Units.parse(stated) != field.units:
            remedy = (
                "add a calibrate line to the ledger" if stated == "m, s" else "correct units or leave it out"
            )
            raise InputError(
                f'units says "{stated}", but the run as read and calibrated is in "{field.units}"; {remedy}'
            )
        model = self.session.error_model
        correlation = model.correlation_nodes
        nodes = (1.0, 1.0) if correlation is None else _pair(correlation)
        window = _pair(model.window) if model.window is not None else _window(nodes, field.grid.spacing)
        error = ErrorModel(
            correlation=nodes,
            correlation_stated=correlation is not None,
            systematic=Systematic(**model.systematic.model_dump()),
            window=window,
        )
        return field.with_(error=replace(error, **self._sigma(field, nodes)))

    def _sigma(self, field: Field, nodes: tuple[float, float]) -> dict:
        stated = self.session.error_model.sigma
        if stated == "estimate":
            return {"sigma": self._noise(nodes), "origin": "estimated"}
        if stated in (None, "from file"):
            if field.error.sigma is None and stated is not None:
                raise InputError(
                    'sigma is "from file", but the run has no column of uncertainties; '
                    'give a number or "estimate"'
                )
            return {"sigma": field.error.sigma, "origin": field.error.origin, "turn": field.error.turn}
        if isinstance(stated, dict):
            extra = [name for name in stated if name not in field.components]
            if extra:
                raise InputError(f"sigma is given for {extra[0]}, which the run does not have; remove it")
            return {"sigma": stated, "origin": "given"}
        return {"sigma": dict.fromkeys(field.components, stated), "origin": "given"}

    def _noise(self, nodes: tuple[float, float]) -> dict[str, float]:
        """Noise per component estimated from frames spread over the run, in the plane's axes."""
        key = ("noise", self._keys[0] + str([s.model_dump_json() for s in self._axes_steps()]) + str(nodes))
        return self.of_the_run(key, lambda: self._estimated(nodes))

    def _estimated(self, nodes: tuple[float, float]) -> dict[str, float]:
        count = len(self.run)
        chosen = np.unique(np.linspace(0, count - 1, min(count, NOISE_FRAMES)).round().astype(int))
        return estimate_sigma([self._placed(int(frame)) for frame in chosen], correlation=nodes)

    def _axes_steps(self):
        return self.session.ledger[: self._axes_lines]

    def _placed(self, frame: int) -> Field:
        """A frame calibrated and turned, before the error model: what the noise is estimated from."""
        field = self.run[frame]
        for line, step in enumerate(self._axes_steps()):
            if step.on:
                field, _ = apply_line(field, line, step, _Around(self, frame, line))
        return field


class _Around:
    """What the ledger may ask about the run around one frame; see ``ledger.Neighbours``."""

    def __init__(self, workbench: Workbench, frame: int, line: int):
        self._workbench = workbench
        self.frame = frame
        self._line = line

    @property
    def rows_downward(self) -> bool:
        return self._workbench.session.run.reading.y_axis == "down"

    def stack(self, half_window: int) -> list[Field]:
        first = max(0, self.frame - half_window)
        last = min(len(self._workbench.run) - 1, self.frame + half_window)
        return [self._workbench._state(frame, self._line)[0] for frame in range(first, last + 1)]

    def run_mean(self) -> complex:
        bench = self._workbench
        return bench.of_the_run(("mean velocity", bench._keys[self._line]), self._mean_velocity)

    def _mean_velocity(self) -> complex:
        bench, total, number = self._workbench, 0j, 0
        for frame in range(len(bench.run)):
            field = bench._state(frame, self._line)[0]
            measured = field.status == Status.MEASURED
            parts = [np.zeros(1) if p is None else p[measured] for p in (field.u, field.v)]
            total += complex(parts[0].sum(), parts[1].sum())
            number += int(measured.sum())
        return total / max(number, 1)

    def noise(self) -> dict[str, float]:
        bench = self._workbench
        error = bench._state(self.frame, self._line)[0].error
        if error.sigma is not None:
            return {name: float(np.nanmedian(sigma)) for name, sigma in error.sigma.items()}
        return bench._noise(error.correlation)


class _Shelf:
    """Least recently used results up to a size; what is ``needed`` again at once is kept by number."""

    def __init__(self, limit: int):
        self._limit = limit
        self._entries: OrderedDict = OrderedDict()
        self._size = 0
        self._lock = threading.Lock()

    def get(self, key):
        with self._lock:
            if key in self._entries:
                self._entries.move_to_end(key)
                return self._entries[key][0]
        return None

    def put(self, key, value, *, needed: int) -> None:
        size = _bytes(value)
        if not needed and size > self._limit:
            return
        with self._lock:
            if key in self._entries:
                self._size -= self._entries.pop(key)[1]
            self._entries[key] = (value, size)
            self._size += size
            kept = max(needed, 1)
            while self._size > self._limit and len(self._entries) > kept:
                self._size -= self._entries.popitem(last=False)[1][1]


def history(field: Field, iy: int, ix: int) -> list[str]:
    """What became of one vector, in plain sentences, oldest first."""
    return [_past(event, iy, ix) for event in field.events if event.nodes[iy, ix]]


def _past(event: Event, iy: int, ix: int) -> str:
    words = f"{event.action} by line {event.line + 1} ({event.step.replace('_', ' ')}"
    if event.residual is not None and event.limit is not None and np.isfinite(event.residual[iy, ix]):
        words += f", residual {figure(event.residual[iy, ix], 2)}, limit {figure(event.limit)}"
    return words + ")"


def _run_key(session: Session) -> str:
    source = session.run
    return f"{session.folder.resolve()}|{source.files}|{source.reading.model_dump_json()}|{source.store}"


def _digest(text: str) -> str:
    return hashlib.sha256(text.encode()).hexdigest()


def _pair(value) -> tuple[float, float]:
    return value if isinstance(value, tuple) else (float(value), float(value))


def _window(nodes, spacing) -> tuple[float, float]:
    x, y = (n * s if np.isfinite(s) else 0.0 for n, s in zip(nodes, spacing, strict=True))
    return (float(x), float(y))


def _bytes(value) -> int:
    if not isinstance(value, tuple) or not isinstance(value[0], Field):
        return 256
    field = value[0]
    arrays = [*field.components.values(), *field.measured.values(), *field.channels.values(), field.status]
    arrays += [event.nodes for event in field.events]
    arrays += [event.residual for event in field.events if event.residual is not None]
    return sum(
        {id(array.base if array.base is not None else array): array.nbytes for array in arrays}.values()
    )


__all__ = ["MEAN", "Frame", "Workbench", "evaluate", "history", "parse_frames", "sentence"]
