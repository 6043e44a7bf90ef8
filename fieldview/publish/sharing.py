"""Frames of a run shared out to processes of this machine or of a cluster, one code path for both.

What is sent is a session's text and frame numbers; what comes back is in the order of the frames. A result
does not depend on who made it, so that any number of workers gives the same bytes.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import Executor
from contextlib import contextmanager
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

from fieldview.compute.errors import InputError
from fieldview.session.models import Session
from fieldview.session.replay import Workbench
from fieldview.session.store import dump_session, parse_session

_ONE_THREAD = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")


@dataclass(frozen=True)
class Share:
    """What a worker needs to open a session: its text and its folder."""

    text: str
    folder: str

    @classmethod
    def of(cls, session: Session) -> Share:
        return cls(dump_session(session), str(session.folder.resolve()))


@lru_cache(maxsize=2)
def bench_of(share: Share) -> Workbench:
    """The session's workbench, kept by a worker from one share of the work to the next."""
    return Workbench(parse_session(share.text).in_folder(Path(share.folder)))


@contextmanager
def workers(number: int, cluster: str | None = None) -> Iterator[Executor | None]:
    """An executor of so many processes, or of a running cluster; None where one process is enough.

    Raises InputError for a number below 1 and a cluster that does not answer.
    """
    if number < 1:
        raise InputError(f"--workers {number} is too few; give 1 or more")
    if cluster is not None:
        with _cluster(cluster) as executor:
            yield executor
        return
    if number == 1:
        yield None
        return
    import multiprocessing
    from concurrent.futures import ProcessPoolExecutor

    before = {name: os.environ.get(name) for name in _ONE_THREAD}
    # threads of the linear algebra would fight the other workers; it reads this when it is loaded
    os.environ.update(dict.fromkeys(_ONE_THREAD, "1"))
    executor = ProcessPoolExecutor(number, mp_context=multiprocessing.get_context("spawn"))
    try:
        yield executor
    finally:
        executor.shutdown(wait=True, cancel_futures=True)
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


@contextmanager
def _cluster(address: str) -> Iterator[Executor]:
    try:
        from distributed import Client
    except ImportError:
        raise InputError("--cluster needs the extra: pip install 'loopflux[cluster]'") from None
    try:
        client = Client(address, timeout=10)
    except (OSError, ValueError, TimeoutError) as error:
        raise InputError(f"--cluster {address} does not answer ({error}); check the scheduler") from None
    with client:
        yield client.get_executor(pure=False)


def in_order(
    work: Callable[[Any], Any], jobs: Sequence[Any], executor: Executor | None, *, ahead: int = 8
) -> Iterator[Any]:
    """Results of the jobs in their order; at most ``ahead`` of them are on the way at a time."""
    if executor is None:
        yield from map(work, jobs)
        return
    waiting: list = []
    for job in jobs:
        waiting.append(executor.submit(work, job))
        if len(waiting) >= ahead:
            yield waiting.pop(0).result()
    for future in waiting:
        yield future.result()


def portions(frames: Iterable, size: int = 4) -> list[tuple]:
    """Frames a few at a time, always the same few."""
    frames = list(frames)
    return [tuple(frames[start : start + size]) for start in range(0, len(frames), size)]
