"""The noise level found again in frames made with a known one."""

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.noise import estimate_sigma
from tests.compute.flows import correlated_noise, lattice, vortex


def noisy_vortex(rng, sigma, nodes, *, outliers=0.05, missing=0.05, core=6.0) -> Field:
    grid = Grid(np.arange(80.0), np.arange(70.0))
    u, v = sigma * correlated_noise(rng, grid.shape, nodes, 2)
    flow = vortex(grid, core=core, centre=38.3 + 33.8j)
    u, v = flow.u + u, flow.v + 1.5 * v
    bad = rng.random(grid.shape) < outliers
    u[bad], v[bad] = rng.uniform(-1.5, 1.5, (2, bad.sum()))
    u[rng.random(grid.shape) < missing] = np.nan
    return Field(grid, u=u, v=np.where(np.isnan(u), np.nan, v))


@pytest.mark.parametrize("nodes", [(1, 1), (2, 2), (4, 4), (1, 3)])
@pytest.mark.parametrize("sigma", [0.01, 0.05])
def test_sigma_over_a_vortex_with_outliers_and_gaps(sigma, nodes):
    rng = np.random.default_rng(sum(nodes))
    found = estimate_sigma([noisy_vortex(rng, sigma, nodes) for _ in range(3)], correlation=nodes)
    assert found["u"] == pytest.approx(sigma, rel=0.10)
    assert found["v"] == pytest.approx(1.5 * sigma, rel=0.10)


def test_the_stated_correlation_decides():
    """Neighbouring differences of correlated noise are small: taken for independent, it looks like less."""
    frames = [noisy_vortex(np.random.default_rng(1), 0.05, (2, 2))]
    found = {nodes: estimate_sigma(frames, correlation=(nodes, nodes))["u"] for nodes in (1.0, 1.5, 2.0)}
    assert found[1.0] < 0.8 * found[2.0]
    assert found[1.0] < found[1.5] < 1.05 * found[2.0]


def test_a_flow_without_noise_has_hardly_any():
    field = vortex(lattice(60, 60), core=5.0, centre=8 + 12j)
    assert estimate_sigma([field], correlation=(1, 1))["u"] < 1e-4


def test_a_single_row_of_nodes():
    rng = np.random.default_rng(2)
    row = Grid(np.arange(400.0), [0.0])
    field = Field(row, w=0.3 * rng.normal(size=(1, 400)) + np.sin(row.x / 40))
    assert estimate_sigma([field], correlation=(1, 1))["w"] == pytest.approx(0.3, rel=0.2)


def test_too_few_neighbours_are_refused_with_the_remedy():
    field = Field(lattice(3, 4), u=np.ones((3, 4)))
    with pytest.raises(InputError, match=r"noise of u cannot be estimated.*state sigma"):
        estimate_sigma([field], correlation=(1, 1))
