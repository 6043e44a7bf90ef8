"""A long run applied, killed and shared out. Only with LOOPFLUX_SOAK=1: it takes some forty minutes.

LOOPFLUX_SOAK_FRAMES sets the number of frames (2,000) for a shorter trial.
"""

import os
import random
import signal
import subprocess
import sys
import time

import pytest

from tests.turbid import turbid_run

pytestmark = pytest.mark.skipif(os.environ.get("LOOPFLUX_SOAK") != "1", reason="set LOOPFLUX_SOAK=1")

FRAMES = int(os.environ.get("LOOPFLUX_SOAK_FRAMES", "2000"))
KILLS, FEW = 20, 50


@pytest.fixture(scope="module")
def session_path(tmp_path_factory):
    return turbid_run(tmp_path_factory.mktemp("run"), FRAMES)


def command(path, out, workers: int, *more) -> list[str]:
    where = ("apply", path, "--out", out, "--to", "npz", "--workers", workers)
    return [sys.executable, "-m", "fieldview", *map(str, (*where, *more))]


def content(folder) -> dict[str, bytes]:
    return {name: (folder / name).read_bytes() for name in sorted(os.listdir(folder))}


@pytest.fixture(scope="module")
def alone(session_path, tmp_path_factory):
    """Folder and seconds of an undisturbed run of one worker."""
    out = tmp_path_factory.mktemp("alone") / "a"
    start = time.perf_counter()
    subprocess.run(command(session_path, out, 1), check=True)
    return out, time.perf_counter() - start


def test_two_workers_are_nearly_twice_as_fast(session_path, tmp_path, alone):
    start = time.perf_counter()
    subprocess.run(command(session_path, tmp_path / "a", 2), check=True)
    gain = alone[1] / (time.perf_counter() - start)
    print(f"two workers are {gain:.2f} x as fast as one, {1e3 * alone[1] / FRAMES:.0f} ms a frame alone")
    assert content(tmp_path / "a") == content(alone[0])
    assert gain >= 1.7


def test_twenty_kills_are_survived(session_path, tmp_path, alone):
    out, chance, killed = tmp_path / "a", random.Random(5), 0
    share = 1.5 * alone[1] / 2 / KILLS
    for _ in range(KILLS):
        process = subprocess.Popen(command(session_path, out, 2), start_new_session=True)
        try:
            process.wait(timeout=3 + chance.uniform(0.1, 1.0) * share)
        except subprocess.TimeoutExpired:
            os.killpg(process.pid, signal.SIGKILL)
            process.wait()
            killed += 1
    subprocess.run(command(session_path, out, 2), check=True)
    print(f"{killed} kills survived")
    assert content(out) == content(alone[0])
    assert killed == KILLS, "it was finished before the last kill: take more frames"


def peak_of_workers(path, out, frames: str) -> float:
    """Largest peak memory of any process below one run of two workers. [MB]"""
    watcher = (
        "import resource, subprocess, sys; subprocess.run(sys.argv[1:], check=True);"
        "print(resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss)"
    )
    asked = command(path, out, 2, "--frames", frames)
    told = subprocess.run([sys.executable, "-c", watcher, *asked], check=True, capture_output=True, text=True)
    return int(told.stdout.split()[-1]) / 1024


def test_memory_of_a_worker_does_not_grow_with_the_run(session_path, tmp_path):
    few = peak_of_workers(session_path, tmp_path / "few", f"0:{FEW}")
    many = peak_of_workers(session_path, tmp_path / "many", f"0:{FRAMES}")
    print(f"{FRAMES} frames {many:.0f} MB, {FEW} frames {few:.0f} MB")
    assert many <= 1.2 * few
