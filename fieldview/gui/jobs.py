"""Background work: a frozen request, a pure function in a thread, frozen answers with the request's id.

Work is a generator of answers (or returns one). Between two answers a lane may turn to something more
urgent, and this is where a cancelled request ends. A later request of the same kind takes the place of an
earlier one, whose late answers are dropped. A lane's thread lives only while it has work.
"""

from __future__ import annotations

import heapq
import itertools
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from types import GeneratorType
from typing import Any

from PySide6.QtCore import QObject, Qt, QTimer, Signal

from fieldview.compute.errors import InputError

SOON, LATER = 0, 1

SLOW_MS = 150
"""Work that is done sooner leaves no trace on the screen: what is shown does not flicker."""


@dataclass(frozen=True, eq=False)
class Request:
    """What is to be done. ``work(*given)`` must not touch the window or shared state; one that ``reports`` is
    given one thing more: a function to be told the share done (0 to 1), which ends it once it is cancelled.
    """

    id: int
    kind: str
    work: Callable[..., Any]
    given: tuple
    urgency: int = SOON
    lane: str = "run"
    title: str = ""
    reports: bool = False
    cancelled: threading.Event = field(default_factory=threading.Event)


class Cancelled(Exception):
    """Ends work in the middle; nobody waits for its answer any more."""


@dataclass(frozen=True, eq=False)
class Progress:
    """Yielded by long work beside its answers: how far it is, 0 to 1."""

    share: float


@dataclass(frozen=True, eq=False)
class Answer:
    """What came of a request; ``last`` marks the end, ``error`` a sentence for the banner."""

    request: int
    kind: str
    value: Any = None
    last: bool = False
    error: str | None = None
    questions: tuple = ()
    failed: bool = False


@dataclass(frozen=True)
class Task:
    """A pending request as the status line shows it; ``slow`` once it takes longer than the eye forgives."""

    kind: str
    title: str
    since: float
    share: float | None = None
    slow: bool = False


class Jobs(QObject):
    """The window's background work. ``answered`` comes on the window's own thread."""

    answered = Signal(object)
    changed = Signal()
    _arrived = Signal(object)

    def __init__(self, parent: QObject | None = None):
        super().__init__(parent)
        self._ids = itertools.count(1)
        self._pending: dict[str, tuple[Request, Task]] = {}
        self._lanes: dict[str, _Lane] = {}
        self._closed = False
        self._slow = QTimer(self)
        self._slow.setSingleShot(True)
        self._slow.setInterval(SLOW_MS)
        self._slow.timeout.connect(self._mark_slow)
        self._arrived.connect(self._deliver, Qt.ConnectionType.QueuedConnection)

    def submit(
        self,
        kind: str,
        work: Callable[..., Any],
        *given,
        urgency: int = SOON,
        lane: str = "run",
        title: str = "",
        reports: bool = False,
    ) -> int:
        """Ask for ``work(*given)`` in the background; returns the request's id, 0 after closing."""
        if self._closed:
            return 0
        self._drop(kind)
        request = Request(next(self._ids), kind, work, given, urgency, lane, title, reports)
        self._pending[kind] = (request, Task(kind, title, time.monotonic()))
        if lane not in self._lanes:
            self._lanes[lane] = _Lane(lane, self._arrived.emit)
        self._lanes[lane].put(request)
        if not self._slow.isActive():
            self._slow.start()
        self.changed.emit()
        return request.id

    def cancel(self, kind: str) -> None:
        """Forget a request; what it still answers is dropped."""
        if self._drop(kind):
            self.changed.emit()

    def cancel_all(self) -> None:
        """Forget every request; the threads end by themselves."""
        for kind in list(self._pending):
            self._drop(kind)
        self.changed.emit()

    def close(self) -> None:
        """Cancel everything and wait for the threads to end."""
        self._closed = True
        self._slow.stop()
        for kind in list(self._pending):
            self._drop(kind)
        for lane in self._lanes.values():
            lane.join()

    @property
    def idle(self) -> bool:
        return not self._pending

    @property
    def tasks(self) -> tuple[Task, ...]:
        return tuple(task for _, task in self._pending.values())

    def is_pending(self, kind: str) -> bool:
        return kind in self._pending

    def _mark_slow(self) -> None:
        now = time.monotonic()
        late = [k for k, (_, t) in self._pending.items() if not t.slow and now - t.since >= 1e-3 * SLOW_MS]
        for kind in late:
            request, task = self._pending[kind]
            self._pending[kind] = (request, replace(task, slow=True))
        if any(not task.slow for _, task in self._pending.values()):
            self._slow.start()
        if late:
            self.changed.emit()

    def _drop(self, kind: str) -> bool:
        request, _ = self._pending.pop(kind, (None, None))
        if request is not None:
            request.cancelled.set()
        return request is not None

    def _deliver(self, answer: Answer) -> None:
        request, task = self._pending.get(answer.kind, (None, None))
        if request is None or request.id != answer.request:
            return
        if isinstance(answer.value, Progress):
            self._pending[answer.kind] = (request, replace(task, share=answer.value.share))
            self.changed.emit()
            return
        if answer.last:
            del self._pending[answer.kind]
        self.answered.emit(answer)
        if answer.last:
            self.changed.emit()


class _Lane:
    """One thread that serves its requests by urgency, an answer at a time."""

    def __init__(self, name: str, send: Callable[[Answer], None]):
        self._name, self._send = name, send
        self._lock = threading.Lock()
        self._queue: list[tuple[int, int, Request, Iterator | None]] = []
        self._thread: threading.Thread | None = None

    def put(self, request: Request) -> None:
        with self._lock:
            heapq.heappush(self._queue, (request.urgency, request.id, request, None))
            if self._thread is None:
                self._thread = threading.Thread(
                    target=self._serve, name=f"loopflux {self._name}", daemon=True
                )
                self._thread.start()

    def join(self) -> None:
        thread = self._thread
        if thread is not None and thread is not threading.current_thread():
            thread.join(timeout=30)

    def _serve(self) -> None:
        while True:
            with self._lock:
                if not self._queue:
                    self._thread = None
                    return
                urgency, number, request, answers = heapq.heappop(self._queue)
            rest = None if request.cancelled.is_set() else self._step(request, answers)
            if rest is not None:
                with self._lock:
                    heapq.heappush(self._queue, (urgency, number, request, rest))

    def _step(self, request: Request, answers: Iterator | None) -> Iterator | None:
        """One answer further; the iterator of those to come, or None at the end."""
        try:
            if answers is None:
                report = (self._reporter(request),) if request.reports else ()
                result = request.work(*request.given, *report)
                if not isinstance(result, GeneratorType):
                    self._tell(Answer(request.id, request.kind, result, last=True))
                    return None
                answers = result
            self._tell(Answer(request.id, request.kind, next(answers)))
            return answers
        except StopIteration:
            self._tell(Answer(request.id, request.kind, None, last=True))
        except Cancelled:
            return None
        except InputError as error:
            questions = tuple(getattr(error, "questions", ()))
            self._tell(
                Answer(request.id, request.kind, None, True, str(error), questions=questions, failed=True)
            )
        except MemoryError:
            text = "the computer has too little memory for this; open fewer or smaller frames"
            self._tell(Answer(request.id, request.kind, None, True, text, failed=True))
        except Exception as error:
            what = f"{type(error).__name__}: {error}"
            text = f"{request.title or request.kind} failed ({what}); undo the last change"
            self._tell(Answer(request.id, request.kind, None, True, text, failed=True))
        return None

    def _reporter(self, request: Request) -> Callable[[float], None]:
        def report(share: float) -> None:
            if request.cancelled.is_set():
                raise Cancelled
            self._tell(Answer(request.id, request.kind, Progress(share)))

        return report

    def _tell(self, answer: Answer) -> None:
        try:
            self._send(answer)
        except RuntimeError:  # the window went away meanwhile: nobody is left to be told
            return
