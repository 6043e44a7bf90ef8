"""Field numerics on 1000 x 1000 nodes, as multiples of a pair of numpy gradients, interleaved in one process.

pair = np.gradient(u, axis=0) + np.gradient(v, axis=1) on the same arrays.
"""

from time import perf_counter

import numpy as np
import pytest

from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.quantities import quantity
from fieldview.compute.validation import median_test

NODES = 1000
ROUNDS = 15


@pytest.fixture(scope="module")
def velocities():
    rng = np.random.default_rng(0)
    x = np.linspace(0, 12, NODES)
    smooth = np.sin(x)[None, :] * np.cos(x)[:, None]
    return smooth + 0.02 * rng.normal(size=(2, NODES, NODES))


def ratio(work, u, v) -> float:
    """Median time of the work over the median time of a pair, taken in turn."""
    times = {"work": [], "pair": []}

    def pair():
        return np.gradient(u, axis=0) + np.gradient(v, axis=1)

    for _ in range(ROUNDS):
        for name, call in (("pair", pair), ("work", work)):
            start = perf_counter()
            call()
            times[name].append(perf_counter() - start)
    found = float(np.median(times["work"]) / np.median(times["pair"]))
    print(f"\n{found:.2f} pairs; a pair is {1e3 * np.median(times['pair']):.1f} ms")
    return found


def test_vorticity_and_divergence_within_two_and_a_half_pairs(velocities):
    u, v = velocities
    field = Field(Grid(np.arange(NODES) * 0.1, np.arange(NODES) * 0.1), u=u, v=v)
    assert ratio(lambda: (quantity(field, "vorticity"), quantity(field, "divergence")), u, v) <= 2.5


def test_normalised_median_test_within_twenty_pairs(velocities):
    u, v = velocities
    missing = np.random.default_rng(1).random(u.shape) < 0.05
    with_gaps = [np.where(missing, np.nan, part) for part in (u, v)]
    assert ratio(lambda: median_test(*with_gaps, floor=0.02), u, v) <= 20
