"""Frames shared out: the same bytes from one process, two processes and a cluster, killed or not."""

import json
import os
import random
import signal
import subprocess
import sys
import time

import numpy as np
import pytest

from fieldview import cli
from fieldview.session.store import save_session
from tests.session.runs import edited, write_frame
from tests.session.test_measure import MODEL

FRAMES = 60


@pytest.fixture(scope="module")
def session_path(tmp_path_factory):
    """60 frames of 32 x 32: a drifting vortex with noise, outliers and gaps."""
    from fieldview.session.models import RunSource, Session
    from tests.session.runs import vortex

    folder = tmp_path_factory.mktemp("run")
    axis = np.arange(32) * 0.002
    xx, yy = np.meshgrid(axis, axis)
    for number in range(FRAMES):
        rng = np.random.default_rng(number)
        u, v = vortex(xx, yy, centre=(0.03 + 1e-4 * number, 0.03))
        u, v = (part + rng.normal(0, 0.004, part.shape) for part in (u, v))
        u[rng.random(u.shape) < 0.02] = 2.0
        u[rng.random(u.shape) < 0.02] = np.nan
        write_frame(folder / f"f{number}.csv", u, v, x=axis, y=axis)
    regions = [
        {"name": "core", "shape": "circle", "centre": [0.032, 0.03], "radius": 0.012},
        {"name": "box", "shape": "rectangle", "corners": [[0.012, 0.012], [0.05, 0.05]]},
        {"name": "cut", "shape": "line", "points": [[0.032, 0.004], [0.032, 0.056]]},
    ]
    ledger = [{"step": "median_test", "floor": 0.004}, {"step": "fill"}]
    session = Session(run=RunSource(files=("f*.csv",))).in_folder(folder)
    save_session(
        edited(session, regions=regions, error_model=MODEL, ledger=ledger), folder / "run.session.json"
    )
    return folder / "run.session.json"


def content(folder) -> dict[str, bytes]:
    return {name: (folder / name).read_bytes() for name in sorted(os.listdir(folder))}


def command(*arguments) -> list[str]:
    return [sys.executable, "-m", "fieldview", *map(str, arguments)]


@pytest.fixture(scope="module")
def alone(session_path, tmp_path_factory):
    out = tmp_path_factory.mktemp("out") / "alone"
    assert cli.run(["apply", str(session_path), "--out", str(out)]) == 0
    return content(out)


def test_two_processes_apply_to_the_same_bytes(session_path, tmp_path, alone):
    subprocess.run(command("apply", session_path, "--out", tmp_path / "a", "--workers", 2), check=True)
    assert content(tmp_path / "a") == alone


@pytest.mark.parametrize(
    "what",
    [
        ["measure", "--format", "csv", "--frames", "0:24"],
        ["stats", "--format", "json"],
        ["check", "--format", "json", "--frames", "0:24"],
    ],
)
def test_two_processes_print_the_same_bytes(session_path, what):
    one, two = (
        subprocess.run(
            command(what[0], session_path, *what[1:], "--workers", n), capture_output=True, check=True
        )
        for n in (1, 2)
    )
    assert one.stdout == two.stdout and len(one.stdout) > 1000


def test_killed_at_random_moments_it_ends_with_the_same_bytes(session_path, tmp_path, alone):
    out, chance = tmp_path / "a", random.Random(3)
    for _ in range(3):
        process = subprocess.Popen(
            command("apply", session_path, "--out", out, "--workers", 2),
            stderr=subprocess.DEVNULL,
            start_new_session=True,
        )
        time.sleep(chance.uniform(1.2, 2.6))
        os.killpg(process.pid, signal.SIGKILL)
        process.wait()
        for path in out.glob("run_*.csv"):
            assert path.read_bytes() == alone[path.name], "only whole files stand under their own name"
    subprocess.run(command("apply", session_path, "--out", out, "--workers", 2), check=True)
    assert content(out) == alone


def test_a_cluster_gives_the_same_bytes(session_path, tmp_path, alone):
    distributed = pytest.importorskip("distributed")
    with distributed.LocalCluster(
        n_workers=2, threads_per_worker=1, dashboard_address=None, processes=True
    ) as cluster:
        address = cluster.scheduler_address
        subprocess.run(
            command("apply", session_path, "--out", tmp_path / "a", "--cluster", address), check=True
        )
    assert content(tmp_path / "a") == alone


def test_bad_requests_for_workers(session_path, capsys):
    assert cli.run(["measure", str(session_path), "--workers", "0"]) == 2
    assert "--workers 0 is too few" in capsys.readouterr().err


def test_check_says_whether_the_run_is_good(session_path, capsys):
    assert cli.run(["check", str(session_path), "--frames", "0:12"]) == 0
    told = capsys.readouterr().out
    for item in ("share measured", "outliers", "peak locking", "divergence", "noise of u", "stuck frames"):
        assert item in told
    assert cli.run(["check", str(session_path), "--frames", "0:6", "--format", "json"]) == 0
    report = json.loads(capsys.readouterr().out)
    assert len(report["frames"]) == 6 and {row["item"] for row in report["findings"]} >= {"outliers", "jumps"}
    assert cli.run(["check", str(session_path), "--frames", "0:6", "--format", "csv"]) == 0
    assert len(capsys.readouterr().out.splitlines()) == 7


def test_statistics_and_their_maps(session_path, tmp_path, capsys):
    import xarray

    maps = tmp_path / "mean.nc"
    arguments = ["stats", str(session_path), "--frames", "0:20", "--at", "0.032,0.02", "--maps", str(maps)]
    assert cli.run([*arguments, "--format", "json"]) == 0
    report = json.loads(capsys.readouterr().out)
    rows = {row["name"]: row for row in report["statistics"]}
    with xarray.open_dataset(maps, engine="h5netcdf", decode_times=False) as data:
        node = rows["mean_u"]["points"][0]["node"]
        assert float(data["mean_u"][tuple(node)]) == rows["mean_u"]["points"][0]["value"]
        assert data["reynolds_uv"].attrs["units"] == "m2 s-2" and "reynolds_uv_uncertainty" in data
        assert np.array_equal(data["u"].values, data["mean_u"].values, equal_nan=True)
    assert cli.run(["stats", str(session_path), "--at", "here"]) == 2
    assert "write a point as x,y" in capsys.readouterr().err
