"""Two-point correlation against numpy, and integral lengths of known correlations."""

import numpy as np
import pytest
from scipy.ndimage import gaussian_filter1d

from fieldview.compute.errors import InputError
from fieldview.compute.grid import Grid
from fieldview.compute.two_point import TwoPoint, integral_length


def test_coefficient_with_gaps_is_numpys():
    rng = np.random.default_rng(1)
    u = rng.normal(size=(60, 4, 5)).cumsum(axis=2) + 30.0
    v = 0.5 * u + rng.normal(size=u.shape)
    for part in (u, v):
        part[rng.random(part.shape) < 0.2] = np.nan
    found = TwoPoint((1, 2), (4, 5))
    pieces = [TwoPoint((1, 2), (4, 5)) for _ in range(3)]
    for number, (one, other) in enumerate(zip(u, v, strict=True)):
        found.add(one, other)
        pieces[number % 3].add(one, other)
    pieces[2].merge(pieces[0])
    pieces[2].merge(pieces[1])
    for iy, ix in np.ndindex(4, 5):
        both = np.isfinite(u[:, 1, 2]) & np.isfinite(v[:, iy, ix])
        wanted = np.corrcoef(u[both, 1, 2], v[both, iy, ix])[0, 1]
        assert found.coefficient()[iy, ix] == pytest.approx(wanted, rel=1e-11)
        assert pieces[2].coefficient()[iy, ix] == pytest.approx(wanted, rel=1e-11)
        assert found.count[iy, ix] == both.sum()


@pytest.mark.parametrize("along", ["+x", "-x"])
def test_integral_length_of_smoothed_noise(along):
    """White noise smoothed by a Gaussian of width s: correlation exp(-r^2/4s^2), length s sqrt(pi)."""
    rng = np.random.default_rng(2)
    grid = Grid(np.arange(81) * 0.5, np.arange(3.0))
    found = TwoPoint((1, 40), grid.shape)
    for _ in range(3000):
        found.add(gaussian_filter1d(rng.normal(size=(3, 141)), 4.0, axis=1, mode="wrap")[:, 30:111])
    assert found.coefficient()[1, 40] == pytest.approx(1.0, abs=1e-12)
    length = integral_length(found.coefficient(), found.uncertainty(), grid, (1, 40), along=along)
    assert length.ends == "zero"
    assert length.length == pytest.approx(2.0 * np.sqrt(np.pi), abs=3 * length.uncertainty)
    assert 0 < length.uncertainty < 0.1 * length.length


def test_the_coefficient_scatters_as_said():
    """At rho = 0.6 from 400 samples; 300 columns of their own reference tell the scatter to 4 %."""
    rng = np.random.default_rng(3)
    ratios = []
    for _ in range(300):
        a = rng.normal(size=400)
        b = 0.6 * a + 0.8 * rng.normal(size=400)
        found = TwoPoint((0, 0), (1, 2))
        found._combine(
            np.full((1, 2), 400),
            np.full((1, 2), a.mean()),
            np.array([[a.mean(), b.mean()]]),
            np.full((1, 2), a.var() * 400),
            np.array([[a.var(), b.var()]]) * 400,
            np.array([[a.var(), np.cov(a, b, bias=True)[0, 1]]]) * 400,
        )
        ratios.append((found.coefficient()[0, 1] - 0.6) / found.uncertainty()[0, 1])
    assert np.std(ratios) == pytest.approx(1.0, rel=0.15)


def test_exact_lengths_and_where_they_end():
    grid = Grid([0.0, 1.0, 2.0, 4.0], [0.0])
    u = np.full((1, 4), 0.1)
    linear = np.array([[1.0, 0.5, 0.0, -0.4]])
    found = integral_length(linear, u, grid, (0, 0), along="+x")
    assert (found.length, found.ends) == (pytest.approx(1.0), "zero")
    crossing = np.array([[1.0, 0.6, -0.2, 0.3]])
    assert integral_length(crossing, u, grid, (0, 0), along="+x").length == pytest.approx(
        0.8 + 0.5 * 0.75 * 0.6
    )
    gap = np.array([[1.0, 0.6, np.nan, 0.3]])
    found = integral_length(gap, u, grid, (0, 0), along="+x")
    assert (found.length, found.ends) == (pytest.approx(0.8), "gap")
    high = np.array([[1.0, 0.9, 0.8, 0.5]])
    found = integral_length(high, u, grid, (0, 0), along="+x")
    assert (found.length, found.ends) == (pytest.approx(0.95 + 0.85 + 1.3), "edge")


def test_what_makes_no_sense_is_said():
    with pytest.raises(InputError, match=r"reference node \(4, 0\) is outside the grid of 3 rows"):
        TwoPoint((4, 0), (3, 3))
    with pytest.raises(InputError, match=r"write \+x, -x, \+y or -y"):
        integral_length(np.ones((1, 2)), np.ones((1, 2)), Grid([0.0, 1.0], [0.0]), (0, 0), along="x")
    empty = np.full((1, 2), np.nan)
    with pytest.raises(InputError, match="too few frames for a correlation"):
        integral_length(empty, empty, Grid([0.0, 1.0], [0.0]), (0, 0), along="+x")
    with pytest.raises(InputError, match="different nodes cannot be merged"):
        TwoPoint((0, 0), (2, 2)).merge(TwoPoint((0, 1), (2, 2)))
