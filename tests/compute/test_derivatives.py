"""Derivative schemes: exact on polynomials of their order, on any axes, with gaps; equal to their rows."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldview.compute.derivatives import SCHEMES, derivative_rows, gradient
from fieldview.compute.errors import InputError
from fieldview.compute.grid import Grid
from tests.compute.flows import lattice

EXACT_DEGREE = {"central": 2, "richardson": 4, "least_squares": 2, "circulation": 2}


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("scheme", SCHEMES)
def test_polynomials_of_the_order_are_exact_up_to_the_edges(scheme, even):
    grid = lattice(9, 11, even=even)
    x, y = grid.x[None, :], grid.y[:, None]
    degree = EXACT_DEGREE[scheme]
    values = (x - 0.3) ** degree - 2 * (y - 1.0) ** degree + 0 * x * y
    found = gradient(values, grid, scheme=scheme)
    scale = np.abs(values).max()
    np.testing.assert_allclose(found.d_dx, degree * (x - 0.3) ** (degree - 1) + 0 * y, atol=1e-11 * scale)
    np.testing.assert_allclose(
        found.d_dy, -2 * degree * (y - 1.0) ** (degree - 1) + 0 * x, atol=1e-11 * scale
    )


@settings(max_examples=40, deadline=None)
@given(
    seed=st.integers(0, 10_000),
    scheme=st.sampled_from(list(SCHEMES)),
    even=st.booleans(),
    share=st.floats(0, 0.5),
)
def test_rows_are_the_very_same_operator_and_keep_linear_fields(seed, scheme, even, share):
    rng = np.random.default_rng(seed)
    grid = lattice(*rng.integers(1, 13, 2), even=even, seed=seed)
    missing = rng.random(grid.shape) < share
    values = np.where(missing, np.nan, rng.normal(size=grid.shape))
    found = gradient(values, grid, scheme=scheme)
    rows = derivative_rows(grid, ~missing, scheme=scheme)
    for matrix, slope in zip(rows, (found.d_dx, found.d_dy), strict=True):
        there = (np.diff(matrix.indptr) > 0).reshape(grid.shape)
        np.testing.assert_array_equal(there, ~np.isnan(slope))
        applied = (matrix @ np.nan_to_num(values).ravel()).reshape(grid.shape)
        np.testing.assert_allclose(applied[there], slope[there], rtol=0, atol=1e-11)
    linear = 3 * grid.x[None, :] - 2 * grid.y[:, None] + 0 * values
    slopes = gradient(linear, grid, scheme=scheme)
    for slope, expected in ((slopes.d_dx, 3), (slopes.d_dy, -2)):
        assert np.abs(slope - expected)[~np.isnan(slope)].max(initial=0) < 1e-11


def test_rows_of_some_nodes_are_rows_of_all():
    grid = lattice(6, 7)
    valid = np.random.default_rng(2).random(grid.shape) > 0.2
    nodes = np.array([3, 20, 41, 0])
    for some, every in zip(
        derivative_rows(grid, valid, scheme="circulation", nodes=nodes),
        derivative_rows(grid, valid, scheme="circulation"),
        strict=True,
    ):
        np.testing.assert_array_equal(some.toarray(), every.toarray()[nodes])


@pytest.mark.parametrize("scheme", SCHEMES)
def test_fallback_marks_edges_and_surroundings_of_a_gap_and_nothing_else(scheme):
    grid = lattice(21, 21)
    values = np.random.default_rng(0).normal(size=grid.shape)
    values[10, 10] = np.nan
    marked = gradient(values, grid, scheme=scheme).fallback
    reach = 2 if scheme in ("richardson", "least_squares") else 1
    edge = np.ones(grid.shape, bool)
    edge[reach:-reach, reach:-reach] = False
    expected = edge.copy()
    for step in range(-reach, reach + 1):
        expected[10 + step, 10] = expected[10, 10 + step] = True
    if scheme == "circulation":
        expected[9:12, 9:12] = True
    expected[10, 10] = False
    np.testing.assert_array_equal(marked, expected)


def test_a_node_alone_has_no_derivative_and_is_not_counted_as_fallback():
    values = np.full((5, 5), np.nan)
    values[2, 2] = 1.0
    found = gradient(values, lattice(5, 5))
    assert np.isnan(found.d_dx).all() and np.isnan(found.d_dy).all() and not found.fallback.any()


def test_two_neighbours_give_a_first_order_slope():
    values = np.full((3, 6), np.nan)
    values[1, 2:4] = [1.0, 2.0]
    grid = Grid(np.arange(6) * 0.25, np.arange(3.0))
    found = gradient(values, grid, scheme="richardson")
    np.testing.assert_allclose(found.d_dx[1, 2:4], 4.0)
    assert found.fallback[1, 2:4].all()


@pytest.mark.parametrize("scheme", SCHEMES)
def test_a_mirrored_field_has_mirrored_derivatives(scheme):
    rng = np.random.default_rng(5)
    axis = np.arange(14.0)
    values = np.where(rng.random((14, 14)) < 0.25, np.nan, rng.normal(size=(14, 14)))
    grid = Grid(axis, axis)
    plain, mirrored = gradient(values, grid, scheme=scheme), gradient(values[:, ::-1], grid, scheme=scheme)
    np.testing.assert_allclose(mirrored.d_dx, -plain.d_dx[:, ::-1], atol=1e-12)
    np.testing.assert_allclose(mirrored.d_dy, plain.d_dy[:, ::-1], atol=1e-12)


def test_an_unknown_scheme_is_named_with_the_known_ones():
    with pytest.raises(InputError, match='"upwind" is not known; the schemes are: central'):
        gradient(np.zeros((3, 3)), lattice(3, 3), scheme="upwind")
