"""Streamlines: circles of a solid turn, straight lines of an even flow, and where they must end."""

import numpy as np
import pytest

from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.streamlines import STEP, streamlines
from tests.compute.flows import lattice, linear_field


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("turned", [False, True])
def test_a_solid_turn_gives_closed_circles(even, turned):
    grid = lattice(41, 41, even=even)
    if turned:
        grid = Grid(grid.x, grid.y, grid.placement.then(turn=0.7, reflect="x", shift=3 + 1j))
    centre = grid.placement.to_plane(complex(grid.x.mean(), grid.y.mean()))
    arm = grid.nodes - centre
    field = Field(grid, u=-2 * arm.imag, v=2 * arm.real)
    radius = 0.3 * np.ptp(grid.y)
    (line,) = streamlines(field, [centre + radius])
    # u and v are linear, so the interpolant is exact: only the steps' own error is left
    np.testing.assert_allclose(np.abs(line - centre), radius, rtol=1e-6)
    assert abs(line[-1] - line[0]) <= STEP * np.diff(grid.x).min(), "it comes back to its seed"
    swept = np.angle((line[1:] - centre) / (line[:-1] - centre)).sum()
    assert swept == pytest.approx(2 * np.pi, abs=0.1), "counter-clockwise, once round"


def test_an_even_flow_gives_straight_lines_to_both_edges():
    grid = lattice(9, 15)
    field = linear_field(grid, ((0, 0), (0, 0)))  # 1, -2 everywhere
    seed = complex(grid.x[7], grid.y[4])
    (line,) = streamlines(field, [seed])
    across = np.imag((line - seed) * np.conj(1 - 2j))
    np.testing.assert_allclose(across, 0, atol=1e-9)
    step = STEP * 0.4
    assert abs(line[0].imag - grid.y[-1]) <= step and abs(line[-1].imag - grid.y[0]) <= step


def test_a_line_ends_before_a_gap_and_a_seed_in_a_gap_has_none():
    grid = Grid(np.arange(20.0), np.arange(10.0))
    u, v = np.ones(grid.shape), np.zeros(grid.shape)
    u[:, 12] = v[:, 12] = np.nan
    line, none, outside = streamlines(Field(grid, u=u, v=v), [5 + 4j, 12 + 4j, 50 + 4j])
    assert 11 - STEP <= line[-1].real <= 11
    assert line[0].real <= STEP
    assert none.size == outside.size == 0


def test_a_field_without_components_in_the_plane_has_no_streamlines():
    grid = Grid(np.arange(4.0), np.arange(4.0))
    assert streamlines(Field(grid, w=np.ones(grid.shape)), [1 + 1j])[0].size == 0
