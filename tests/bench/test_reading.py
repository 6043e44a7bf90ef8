"""Reading a million-row text file into a Field, as a multiple of pandas reading it, interleaved."""

from time import perf_counter

import numpy as np
import pytest

from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.files import open_run
from fieldview.files.delimited import write_csv
from fieldview.files.stored import write_store

ROUNDS = 5


@pytest.fixture(scope="module")
def million_rows(tmp_path_factory):
    path = tmp_path_factory.mktemp("bench") / "a.csv"
    axis = np.arange(1000) * 0.001
    xx, yy = np.meshgrid(axis, axis)
    u, v = np.random.default_rng(0).normal(size=(2, 1_000_000))
    table = np.column_stack([xx.ravel(), yy.ravel(), u, v])
    np.savetxt(path, table, fmt="%.6f", delimiter=",", header="x [m],y [m],u [m/s],v [m/s]", comments="")
    return path


def test_reading_a_million_rows(million_rows):
    import pandas

    ratios = []
    for _ in range(ROUNDS):
        start = perf_counter()
        pandas.read_csv(million_rows, header=None, names=range(4), skiprows=1, low_memory=False)
        middle = perf_counter()
        field = open_run([million_rows])[0]
        end = perf_counter()
        ratios.append((end - middle) / (middle - start))
    assert field.grid.shape == (1000, 1000)
    ratio = float(np.median(ratios))
    print(f"a million rows into a Field: {ratio:.2f} x pandas.read_csv")
    assert ratio <= 1.8


def test_frames_come_ten_times_faster_from_a_store(tmp_path):
    """Scrubbing: frames of 128 x 128 in any order, from text and from the run store."""
    axis = np.arange(128) * 0.001
    rng = np.random.default_rng(0)
    for number in range(20):
        field = Field(Grid(axis, axis), **dict(zip("uv", rng.normal(size=(2, 128, 128)), strict=True)))
        write_csv(tmp_path / f"f{number}.csv", field)
    text = open_run(["f*.csv"], folder=tmp_path)
    write_store(text, tmp_path / "a.store.h5")
    kept = open_run(["f*.csv"], folder=tmp_path, store="a.store.h5")
    order = rng.permutation(20)

    def seconds(run) -> float:
        start = perf_counter()
        for number in order:
            run[number]
        return perf_counter() - start

    seconds(kept)
    ratio = min(seconds(text) for _ in range(3)) / min(seconds(kept) for _ in range(3))
    print(f"frames from the store come {ratio:.0f} x faster than from text")
    assert ratio >= 10
