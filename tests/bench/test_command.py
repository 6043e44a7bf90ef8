"""The command as a whole process: how soon it answers, and how much memory a long run takes."""

import os
import resource
import subprocess
import sys
from time import perf_counter

import numpy as np

from fieldview.session.models import RunSource, Session
from fieldview.session.regions import Circle
from fieldview.session.steps import Fill, MedianTest
from fieldview.session.store import save_session

ROUNDS = 9


def seconds(*command: str) -> float:
    start = perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL)
    return perf_counter() - start


def test_help_answers_at_once():
    times = ([], [])
    for _ in range(ROUNDS):
        times[0].append(seconds(sys.executable, "-m", "fieldview", "--help"))
        times[1].append(seconds(sys.executable, "-c", "import numpy"))
    ratio = float(np.median(times[0]) / np.median(times[1]))
    print(f"loopflux --help: {ratio:.2f} x importing numpy")
    assert ratio <= 4


def peak_megabytes(path, frames: str) -> float:
    """Peak resident memory of one measurement, in a process of its own."""
    child = os.fork()
    if child == 0:
        devnull = os.open(os.devnull, os.O_WRONLY)
        os.dup2(devnull, 1)
        os.execv(
            sys.executable, [sys.executable, "-m", "fieldview", "measure", str(path), "--frames", frames]
        )
    _, status, usage = os.wait4(child, 0)
    assert os.waitstatus_to_exitcode(status) == 0
    return usage.ru_maxrss / 1024


def test_memory_does_not_grow_with_the_run(tmp_path):
    axis = np.arange(128) * 0.001
    xx, yy = np.meshgrid(axis, axis)
    rng = np.random.default_rng(0)
    for number in range(500):
        u, v = rng.normal(0, 0.01, (2, 128, 128))
        np.savez(tmp_path / f"f{number}.npz", x=axis, y=axis, u=u - yy, v=v + xx)
    session = Session(
        run=RunSource.model_validate(
            {"files": ["f*.npz"], "reading": {"length_unit": "m", "velocity_unit": "m/s"}}
        ),
        ledger=(MedianTest(floor=0.01), Fill()),
        regions=(Circle(name="c", centre=(0.06, 0.06), radius=0.03),),
    )
    path = tmp_path / "a.session.json"
    save_session(session.in_folder(tmp_path), path)
    few, many = peak_megabytes(path, "0:5"), peak_megabytes(path, "0:500")
    print(f"500 frames {many:.0f} MB, 5 frames {few:.0f} MB: {many / few:.2f}")
    assert resource.getpagesize() and many <= 1.3 * few
