"""Tests of vectors: against a node-by-node statement of each, and on planted outliers."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldview.compute.errors import InputError
from fieldview.compute.validation import median_test, quality_test, range_test, spread_test, time_test
from tests.compute.flows import lattice, vortex


def stated_residual(values: np.ndarray, radius: int, floor: float) -> np.ndarray:
    """Westerweel & Scarano (2005) eq. 2 read out loud: NaN with under three neighbours, or none to judge."""
    residual = np.full(values.shape, np.nan)
    for iy, ix in np.argwhere(np.isfinite(values)):
        around = values[max(iy - radius, 0) : iy + radius + 1, max(ix - radius, 0) : ix + radius + 1].copy()
        around[min(iy, radius), min(ix, radius)] = np.nan
        neighbours = around[np.isfinite(around)]
        if neighbours.size >= 3:
            median = np.median(neighbours)
            spread = np.median(np.abs(neighbours - median))
            residual[iy, ix] = abs(values[iy, ix] - median) / (spread + floor)
    return residual


@settings(max_examples=60, deadline=None)
@given(
    seed=st.integers(0, 10_000),
    ny=st.integers(1, 14),
    nx=st.integers(1, 14),
    share=st.floats(0, 0.9),
    radius=st.integers(1, 4),
)
def test_median_residual_is_the_published_one_with_any_gaps(seed, ny, nx, share, radius):
    rng = np.random.default_rng(seed)
    u, v = rng.normal(size=(2, ny, nx))
    gone = rng.random((ny, nx)) < share
    u[gone] = v[gone] = np.nan
    found = median_test(u, v, radius=radius, threshold=2.0, floor={"u": 0.1, "v": 0.3})
    expected = np.maximum(stated_residual(u, radius, 0.1), stated_residual(v, radius, 0.3))
    np.testing.assert_allclose(found.residual, expected, rtol=1e-12)
    np.testing.assert_array_equal(found.rejected, expected > 2.0)
    np.testing.assert_array_equal(found.not_judged, np.isnan(expected) & ~gone)


def test_median_residual_of_a_large_block_structured_field():
    """More nodes than one block holds, gaps of every size, against the statement on a random part."""
    rng = np.random.default_rng(1)
    u = rng.normal(size=(260, 300))
    u[rng.random(u.shape) < 0.06] = np.nan
    u[40:60, 100:130] = np.nan
    found = median_test(u, floor=0.05)
    part = (slice(30, 80), slice(90, 150))
    wide = u[29:81, 89:151]
    np.testing.assert_allclose(found.residual[part], stated_residual(wide, 1, 0.05)[1:-1, 1:-1], rtol=1e-12)


def test_outliers_in_a_vortex_are_found_and_good_vectors_kept():
    rng = np.random.default_rng(2)
    grid = lattice(60, 60)
    field = vortex(grid, core=4.0, centre=8 + 10j)
    u, v = field.u + 0.01 * rng.normal(size=(2, *grid.shape))
    bad = rng.random(grid.shape) < 0.05
    u[bad] += rng.choice([-1, 1], bad.sum()) * rng.uniform(0.5, 1.5, bad.sum())
    found = median_test(u, v, floor=0.02, passes=2)
    assert found.rejected[bad].mean() > 0.98
    assert found.rejected[~bad].mean() < 0.03


def test_a_later_pass_finds_what_a_pair_of_outliers_hid():
    u = np.zeros((7, 7))
    u[3, 2], u[3, 3], u[3, 4], u[2, 3], u[4, 3] = 9.0, 5.0, 9.0, 9.0, 9.0
    once = median_test(u, floor=0.1, threshold=20).rejected
    twice = median_test(u, floor=0.1, threshold=20, passes=3)
    assert not once[3, 3] and twice.rejected[3, 3] and twice.rejected[once].all()
    assert np.nanmax(twice.residual[~twice.rejected]) <= 20


def test_without_floor_equal_vectors_are_kept_and_the_odd_one_is_not():
    u = np.ones((5, 5))
    u[2, 2] = 1.001
    found = median_test(u, floor=0.0)
    assert found.rejected.sum() == 1 and found.rejected[2, 2] and np.isinf(found.residual[2, 2])


def test_three_components_and_one():
    rng = np.random.default_rng(3)
    u, v, w = rng.normal(size=(3, 8, 8))
    alone = [median_test(part, floor=0.2).residual for part in (u, v, w)]
    together = median_test(u, v, w, floor=0.2)
    np.testing.assert_allclose(together.residual, np.max(alone, axis=0))
    np.testing.assert_allclose(median_test(w=w, floor={"w": 0.2}).residual, alone[2])


def test_range_keeps_the_limits_themselves():
    u, v = np.array([[0.0, 1.0, 2.0, np.nan]]), np.array([[0.0, -1.0, 2.0, np.nan]])
    assert range_test(u, v, limits={"u": (0.0, 1.0)}).rejected.tolist() == [[False, False, True, False]]
    found = range_test(u, v, limits={"v": (-0.5, None), "speed": (None, 2.0)})
    assert found.rejected.tolist() == [[False, True, True, False]]


def test_quality_outside_limits_and_unknown():
    found = quality_test([[0.1, 0.5, 0.9, np.nan]], at_least=0.5, at_most=0.8)
    assert found.rejected.tolist() == [[True, False, True, False]]
    assert found.not_judged.tolist() == [[False, False, False, True]]


def test_spread_is_measured_in_scaled_median_deviations():
    u = np.array([[0.0, 1.0, 2.0, 3.0, 4.0, 50.0, np.nan]])
    found = spread_test(u, limit=5.0)
    # median 2.5, absolute deviations 2.5 1.5 0.5 0.5 1.5 47.5: their median 1.5
    expected = np.abs(u - 2.5) / (1.4826022185056018 * 1.5)
    np.testing.assert_allclose(found.residual, expected)
    assert found.rejected.tolist() == [[False] * 5 + [True, False]]


def test_time_test_against_its_statement():
    rng = np.random.default_rng(4)
    stack = {name: rng.normal(size=(7, 5, 6)) for name in "uv"}
    gone = rng.random((7, 5, 6)) < 0.4
    for part in stack.values():
        part[gone] = np.nan
    judged = {name: part[3] for name, part in stack.items()}
    found = time_test(judged, stack, limit=3.0)
    expected = np.full((5, 6), np.nan)
    for place in np.ndindex(5, 6):
        ratios = []
        for part in stack.values():
            samples = part[(slice(None), *place)]
            samples = samples[np.isfinite(samples)]
            if samples.size >= 3 and np.isfinite(part[(3, *place)]):
                median = np.median(samples)
                spread = 1.4826022185056018 * np.median(np.abs(samples - median))
                ratios.append(abs(part[(3, *place)] - median) / spread)
        expected[place] = max(ratios, default=np.nan)
    np.testing.assert_allclose(found.residual, expected)
    np.testing.assert_array_equal(found.not_judged, np.isfinite(judged["u"]) & np.isnan(expected))


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda u: median_test(u, floor=-1.0), "floor of u is -1.0; give the expected noise level"),
        (lambda u: median_test(u, floor=0.1, threshold=0), "threshold is 0; give a positive number"),
        (lambda u: median_test(u, floor=0.1, radius=0), "radius is 0 and passes is 1"),
        (lambda u: spread_test(u, limit=0), "limit is 0; give a positive number"),
        (lambda u: range_test(u, limits={"u": (2, 1)}), "limits of u are 2 to 1; give the lower one first"),
        (lambda u: range_test(u, limits={"w": (1, 2)}), "limits are given for w, which is not there"),
        (lambda u: median_test(floor=0.1), "component arrays of one shape"),
    ],
)
def test_what_makes_no_sense_is_refused(call, message):
    with pytest.raises(InputError, match=message):
        call(np.zeros((4, 4)))
