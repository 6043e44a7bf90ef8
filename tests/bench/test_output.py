"""Figures and exports against what the libraries do with the same content."""

import io
import os
import sys
from time import perf_counter

import numpy as np
import pytest
import xarray

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.quantities import quantity
from fieldview.files.npz import write_npz
from fieldview.files.writers import ENDINGS
from fieldview.publish.figures import draw, picture
from fieldview.session.figures import FigureSettings
from fieldview.session.replay import Workbench
from tests.turbid import turbid_run

ROUNDS = 3


@pytest.fixture(scope="module")
def large(tmp_path_factory) -> Workbench:
    """One frame of 1000 x 1000 nodes."""
    from fieldview.session.models import RunSource, Session

    folder = tmp_path_factory.mktemp("large")
    axis = np.arange(1000) * 0.001
    x, y = np.meshgrid(axis, axis)
    write_npz(folder / "a.npz", Field(Grid(axis, axis), u=np.sin(9 * y), v=np.cos(7 * x)))
    bench = Workbench(Session(run=RunSource(files=("a.npz",))).in_folder(folder), cache_bytes=1 << 30)
    bench.field(0)
    return bench


def test_a_figure_within_three_times_an_image_and_a_quiver(large):
    from matplotlib.figure import Figure

    settings = FigureSettings(width_mm=175, dpi=200)
    every = 14
    times: tuple[list, list] = ([], [])
    for _ in range(ROUNDS):
        field = large.field(0)
        start = perf_counter()
        picture(draw(large, settings), settings, "png")
        middle = perf_counter()
        figure = Figure(figsize=(175 / 25.4, 165 / 25.4))
        axes = figure.add_subplot()
        values = quantity(field, "vorticity")
        grid, part = field.grid, slice(None, None, every)
        image = axes.imshow(values, origin="lower", extent=(0, 1, 0, 1), cmap="RdBu_r")
        axes.quiver(grid.x[part], grid.y[part], field.u[part, part], field.v[part, part], angles="xy")
        figure.colorbar(image)
        figure.savefig(io.BytesIO(), format="png", dpi=200)
        times[0].append(middle - start)
        times[1].append(perf_counter() - middle)
    ratio = float(np.median(times[0]) / np.median(times[1]))
    print(f"a figure takes {ratio:.2f} x an image and a quiver, {1e3 * np.median(times[0]):.0f} ms")
    assert ratio <= 3


def test_netcdf_of_many_frames_at_half_the_speed_of_xarray(tmp_path):
    """500 frames of 128 x 128, written by ours and by xarray from the ready arrays."""
    from fieldview.files.netcdf import write_netcdf

    axis, rng = np.arange(128) * 0.001, np.random.default_rng(0)
    frames = [rng.normal(size=(2, 128, 128)) for _ in range(20)]
    error = ErrorModel(sigma={"u": 0.1, "v": 0.1}, origin="given")
    ours = theirs = 0.0
    for number in range(500):
        u, v = frames[number % 20]
        field = Field(Grid(axis, axis), u=u, v=v, error=error)
        sigma, status = np.full(u.shape, 0.1), np.zeros(u.shape, np.uint8)
        start = perf_counter()
        write_netcdf(tmp_path / f"o{number}.nc", field)
        middle = perf_counter()
        arrays = {"u": u, "v": v, "sigma_u": sigma, "sigma_v": sigma, "status": status}
        named = {name: (("y", "x"), part) for name, part in arrays.items()}
        data = xarray.Dataset(named, {"x": axis, "y": axis})
        for name in arrays:
            data[name].attrs = {"units": "m s-1", "long_name": name}
        data.to_netcdf(tmp_path / f"t{number}.nc", engine="h5netcdf")
        ours, theirs = ours + middle - start, theirs + perf_counter() - middle
    print(f"NetCDF at {theirs / ours:.2f} of the speed of xarray, {1e3 * ours / 500:.1f} ms a frame")
    assert theirs / ours >= 0.5


@pytest.mark.parametrize("to", ENDINGS)
def test_memory_of_exports_does_not_grow_with_the_run(to, tmp_path):
    """Peak of `apply` over 120 frames against 6, each in a process of its own."""
    path = turbid_run(tmp_path, 120, 64)

    def peak(frames: str) -> float:
        out = tmp_path / frames.replace(":", "_")
        child = os.fork()
        if child == 0:
            os.dup2(os.open(os.devnull, os.O_WRONLY), 1)
            asked = ["apply", str(path), "--out", str(out), "--to", to, "--frames", frames]
            os.execv(sys.executable, [sys.executable, "-m", "fieldview", *asked])
        _, status, usage = os.wait4(child, 0)
        assert os.waitstatus_to_exitcode(status) == 0
        return usage.ru_maxrss / 1024

    few, many = peak("0:6"), peak("0:120")
    print(f"{to}: 120 frames {many:.0f} MB, 6 frames {few:.0f} MB")
    assert many <= 1.2 * few
