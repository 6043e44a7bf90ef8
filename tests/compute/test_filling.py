"""Filling: what each method reproduces, what it leaves, and the matrix it is."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldview.compute.errors import InputError
from fieldview.compute.filling import METHODS, fill_map
from fieldview.compute.gaps import find_gaps
from fieldview.compute.grid import Grid
from tests.compute.flows import lattice


def applied(change, values, valid):
    return change.forward(np.where(valid, values, 0.0).ravel()).reshape(valid.shape)


@settings(max_examples=40, deadline=None)
@given(
    seed=st.integers(0, 10_000),
    method=st.sampled_from(METHODS[:3]),
    even=st.booleans(),
    share=st.floats(0, 0.6),
)
def test_linear_fields_come_back_to_round_off(seed, method, even, share):
    rng = np.random.default_rng(seed)
    grid = lattice(*rng.integers(1, 16, 2), even=even, seed=seed)
    wanted = rng.random(grid.shape) < share
    mask = rng.random(grid.shape) < 0.05
    valid = ~wanted & ~mask
    wanted &= ~mask
    values = 1 + 2 * grid.x[None, :] - 3 * grid.y[:, None]
    change = fill_map(grid, valid, wanted, method=method)
    scale = np.abs(values).max()
    found = applied(change, values, valid)
    # biharmonic weights of both signs may add up a few times the round-off
    atol = (1e-9 if method == "biharmonic" else 1e-13) * scale
    np.testing.assert_allclose(found[change.filled], values[change.filled], rtol=0, atol=atol)
    np.testing.assert_array_equal(change.filled | change.left, wanted)
    assert not (change.filled & change.left).any()


@settings(max_examples=30, deadline=None)
@given(seed=st.integers(0, 10_000), method=st.sampled_from(METHODS))
def test_weights_stand_on_valid_nodes_alone_and_sum_to_one(seed, method):
    rng = np.random.default_rng(seed)
    grid = lattice(12, 13, even=bool(seed % 2), seed=seed)
    wanted = rng.random(grid.shape) < 0.3
    valid = ~wanted & (rng.random(grid.shape) > 0.05)
    values = {name: np.where(valid, rng.normal(size=grid.shape), np.nan) for name in "uv"}
    matrix = fill_map(grid, valid, wanted, method=method, values=values).matrix.toarray()
    change = fill_map(grid, valid, wanted, method=method, values=values)
    np.testing.assert_array_equal(matrix[valid.ravel()], np.eye(valid.size)[valid.ravel()])
    np.testing.assert_array_equal(matrix[:, ~valid.ravel()], 0)
    np.testing.assert_array_equal(matrix[~(valid | change.filled).ravel()], 0)
    np.testing.assert_allclose(matrix[change.filled.ravel()].sum(axis=1), 1, atol=1e-10)
    if method in ("linear", "harmonic"):
        assert matrix.min() >= -1e-12


@pytest.mark.parametrize("even", [True, False])
def test_biharmonic_reproduces_cubics(even):
    grid = lattice(20, 22, even=even)
    x, y = grid.x[None, :] - grid.x.mean(), grid.y[:, None] - grid.y.mean()
    values = 1 + x - 2 * y + x * y + x**2 - y**2 + x**3 - 2 * y**3 + 0.5 * x**2 * y - x * y**2
    wanted = np.zeros(grid.shape, bool)
    wanted[4:7, 5:9] = wanted[10, 10] = wanted[10:15, 14] = True
    wanted[0, 10:13] = wanted[15:17, 0] = True
    change = fill_map(grid, ~wanted, wanted, method="biharmonic")
    assert change.filled.sum() == wanted.sum()
    found = applied(change, values, ~wanted)
    np.testing.assert_allclose(found, values, rtol=0, atol=1e-11 * np.abs(values).max())


def test_harmonic_solves_laplace_across_the_gap():
    rng = np.random.default_rng(0)
    grid = lattice(15, 15, even=False)
    wanted = np.zeros(grid.shape, bool)
    wanted[4:10, 3:11] = True
    change = fill_map(grid, ~wanted, wanted, method="harmonic")
    found = applied(change, rng.normal(size=grid.shape), ~wanted)

    def second(values, axis):
        left, right = np.diff(axis)[:-1], np.diff(axis)[1:]
        slopes = np.diff(values, axis=-1) / np.diff(axis)
        return 2 * np.diff(slopes, axis=-1) / (left + right)

    laplacian = second(found, grid.x)[1:-1] + second(found.T, grid.y).T[:, 1:-1]
    assert np.abs(laplacian[wanted[1:-1, 1:-1]]).max() < 1e-11
    # maximum principle
    rim = np.zeros_like(wanted)
    rim[3:11, 2:12] = True
    assert (
        found[wanted].max() < found[rim & ~wanted].max() and found[wanted].min() > found[rim & ~wanted].min()
    )


def test_large_gaps_take_the_same_equations():
    grid = lattice(24, 24)
    wanted = np.zeros(grid.shape, bool)
    wanted[5:17, 6:18] = True
    values = grid.x[None, :] ** 2 - grid.y[:, None] ** 2
    change = fill_map(grid, ~wanted, wanted, method="harmonic")
    # x^2 - y^2 is harmonic, and the second differences of it are exact
    np.testing.assert_allclose(applied(change, values, ~wanted), values, rtol=0, atol=1e-12)


def test_a_single_missing_node_is_the_mean_of_its_neighbours():
    grid = Grid(np.arange(5.0), np.arange(5.0))
    wanted = np.zeros(grid.shape, bool)
    wanted[2, 2] = True
    row = fill_map(grid, ~wanted, wanted, method="linear").matrix[[12]].toarray().reshape(5, 5)
    expected = np.zeros((5, 5))
    expected[1, 2] = expected[3, 2] = expected[2, 1] = expected[2, 3] = 0.25
    np.testing.assert_allclose(row, expected, atol=1e-5)


@pytest.mark.parametrize("method", METHODS)
def test_a_mirrored_or_turned_lattice_is_filled_alike(method):
    rng = np.random.default_rng(3)
    axis = np.arange(14.0)
    grid = Grid(axis, axis)
    wanted = rng.random(grid.shape) < 0.3
    values = rng.normal(size=grid.shape)
    for change in (np.fliplr, np.flipud, np.transpose):
        fills = []
        for turn in (lambda a: a, change):
            valid, own = ~turn(wanted), turn(values)
            fill = fill_map(grid, valid, ~valid, method=method, values={"u": np.where(valid, own, np.nan)})
            fills.append(applied(fill, own, valid))
        np.testing.assert_allclose(fills[1], change(fills[0]), atol=2e-4 if method == "linear" else 1e-10)


@pytest.mark.parametrize("method", METHODS)
def test_what_lies_far_away_does_not_matter(method):
    rng = np.random.default_rng(4)
    grid = lattice(12, 40)
    near = np.zeros(grid.shape, bool)
    near[4:7, 5:8] = True
    far = near.copy()
    far[:, 25:] = rng.random((12, 15)) < 0.5
    values = rng.normal(size=grid.shape)
    filled = [
        applied(fill_map(grid, ~gone, gone, method=method, values={"u": values}), values, ~gone)[near]
        for gone in (near, far)
    ]
    np.testing.assert_allclose(filled[1], filled[0], atol=1e-12)


@pytest.mark.parametrize("method", METHODS[:3])
def test_nothing_is_extrapolated(method):
    grid = lattice(10, 10)
    wanted = np.zeros(grid.shape, bool)
    wanted[:3, :3] = wanted[5, 9] = True
    change = fill_map(grid, ~wanted, wanted, method=method)
    assert change.left[:2, :2].all() and not change.filled[0, 0]
    assert change.filled[5, 9]


def test_masked_nodes_are_walls_and_stay():
    grid = lattice(9, 9)
    mask = np.zeros(grid.shape, bool)
    mask[4, :] = True
    wanted = np.zeros(grid.shape, bool)
    wanted[3, 4] = True
    for method in METHODS[:3]:
        change = fill_map(grid, ~(wanted | mask), wanted, method=method)
        sources = change.matrix[[3 * 9 + 4]].toarray().reshape(9, 9) != 0
        assert change.filled.sum() == 1 and not sources[4:].any()


def test_gap_width_is_the_side_of_the_largest_square_that_fits():
    wanted = np.zeros((12, 20), bool)
    wanted[1, 1:9] = True
    wanted[3:6, 2:5] = True
    wanted[8:10, 8:18] = wanted[10, 9] = True
    gaps = find_gaps(wanted)
    assert sorted(gaps.width) == [0, 1, 2, 3]
    assert gaps.width[gaps.label[1, 4]] == 1 and gaps.width[gaps.label[4, 3]] == 3
    assert gaps.width[gaps.label[10, 9]] == 2


def test_gaps_wider_than_the_limit_stay_whole():
    grid = lattice(12, 20)
    wanted = np.zeros(grid.shape, bool)
    wanted[2, 2:9] = wanted[5:8, 5:9] = True
    change = fill_map(grid, ~wanted, wanted, max_gap=2)
    assert change.filled.sum() == 7 and change.left.sum() == 12 and change.max_gap == 2


def test_local_median_of_one_component_is_the_median_of_what_is_nearest():
    grid = lattice(5, 5)
    values = np.arange(25.0).reshape(5, 5) ** 1.5
    wanted = np.zeros(grid.shape, bool)
    wanted[1:4, 1:4] = True
    change = fill_map(grid, ~wanted, wanted, method="local_median", values={"u": values})
    found = applied(change, values, ~wanted)
    assert found[1, 1] == pytest.approx(np.median(values[:3, :3][~wanted[:3, :3]]))
    assert found[2, 2] == pytest.approx(np.median(values[~wanted]))
    assert not change.exact and "not linear" in change.note


def test_local_median_of_vectors_takes_one_of_them_whole():
    grid = lattice(3, 3)
    u = np.array([[0, 0, 0], [0, np.nan, 9], [0, 0, 1.0]])
    v = np.array([[0, 0.1, 0.2], [0.3, np.nan, 5], [-0.1, -0.2, -3.0]])
    wanted = np.isnan(u)
    change = fill_map(grid, ~wanted, wanted, method="local_median", values={"u": u, "v": v})
    assert change.matrix[[4]].nnz == 1
    assert (applied(change, u, ~wanted)[1, 1], applied(change, v, ~wanted)[1, 1]) == (0, pytest.approx(0.0))


def test_all_missing_leaves_all():
    grid = lattice(4, 4)
    wanted = np.ones(grid.shape, bool)
    for method in METHODS:
        change = fill_map(grid, ~wanted, wanted, method=method, values={"u": np.full(grid.shape, np.nan)})
        assert change.left.all() and change.matrix.nnz == 0


def test_unknown_method_and_missing_values_are_refused():
    grid = lattice(4, 4)
    wanted = np.eye(4, dtype=bool)
    with pytest.raises(InputError, match='fill method "kriging" is not known'):
        fill_map(grid, ~wanted, wanted, method="kriging")
    with pytest.raises(InputError, match="needs the components' values"):
        fill_map(grid, ~wanted, wanted, method="local_median")
