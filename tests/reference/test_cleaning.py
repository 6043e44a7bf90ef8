"""Filling, smoothing and robust scales against independent implementations."""

import numpy as np
import pytest
from scipy.fft import dctn, idctn
from scipy.interpolate import griddata
from scipy.ndimage import gaussian_filter
from scipy.signal import savgol_filter
from scipy.stats import median_abs_deviation, norm

from fieldview.compute.filling import fill_map
from fieldview.compute.grid import Grid
from fieldview.compute.medians import MAD_TO_SIGMA
from fieldview.compute.smoothing import smoothing_map
from fieldview.compute.validation import spread_test
from tests.compute.flows import lattice


@pytest.mark.parametrize("seed", range(6))
def test_linear_fill_is_delaunay_interpolation(seed):
    """scipy.interpolate.griddata over all valid nodes; axes uneven, so that the triangles are unique."""
    rng = np.random.default_rng(seed)
    grid = lattice(16, 18, even=False, seed=seed)
    wanted = np.zeros(grid.shape, bool)
    for _ in range(5):
        iy, ix = rng.integers(1, 12, 2)
        wanted[iy : iy + rng.integers(1, 4), ix : ix + rng.integers(1, 4)] = True
    values = rng.normal(size=grid.shape)
    change = fill_map(grid, ~wanted, wanted, method="linear")
    found = change.forward(np.where(wanted, 0, values).ravel()).reshape(grid.shape)
    z = grid.nodes
    points = np.column_stack([z[~wanted].real, z[~wanted].imag])
    expected = griddata(points, values[~wanted], np.column_stack([z[wanted].real, z[wanted].imag]))
    # near-ties within 1e-5 of a circle are decided otherwise: none at these seeds
    np.testing.assert_allclose(found[wanted], expected, rtol=0, atol=1e-12)


def test_linear_fill_on_an_even_lattice_lies_between_its_triangulations():
    """griddata draws one diagonal of each square; ours is the mean over the ways of drawing them."""
    rng = np.random.default_rng(7)
    grid = Grid(np.arange(12.0), np.arange(12.0))
    wanted = np.zeros(grid.shape, bool)
    wanted[3:5, 4:6] = wanted[8, 8] = True
    values = rng.normal(size=grid.shape)
    change = fill_map(grid, ~wanted, wanted, method="linear")
    found = change.forward(np.where(wanted, 0, values).ravel()).reshape(grid.shape)[wanted]
    z = grid.nodes
    drawn = []
    for _ in range(40):
        points = np.column_stack([z[~wanted].real, z[~wanted].imag])
        points = points + 1e-7 * rng.normal(size=points.shape)
        drawn.append(griddata(points, values[~wanted], np.column_stack([z[wanted].real, z[wanted].imag])))
    low, high = np.min(drawn, axis=0), np.max(drawn, axis=0)
    assert (found >= low - 1e-4).all() and (found <= high + 1e-4).all()


@pytest.mark.parametrize("window", [3, 5, 9])
def test_savitzky_golay_on_full_grids(window):
    """scipy.signal.savgol_filter, second order, along x and then along y, polynomial ends."""
    values = np.random.default_rng(0).normal(size=(15, 18))
    grid = lattice(15, 18)
    change = smoothing_map(grid, np.ones(grid.shape, bool), method="savitzky_golay", width=window)
    expected = savgol_filter(savgol_filter(values, window, 2, axis=1), window, 2, axis=0)
    np.testing.assert_allclose(change.forward(values.ravel()).reshape(15, 18), expected, atol=1e-12)


def test_gaussian_with_gaps_is_the_ratio_of_two_filters():
    """Normalised convolution: scipy.ndimage.gaussian_filter of the values over that of the mask."""
    rng = np.random.default_rng(1)
    valid = rng.random((20, 21)) > 0.2
    values = rng.normal(size=valid.shape)
    change = smoothing_map(lattice(20, 21), valid, width=1.0)

    def blurred(part):
        return gaussian_filter(part.astype(float), 1.0, mode="constant", truncate=4.0)

    expected = blurred(np.where(valid, values, 0)) / blurred(valid)
    np.testing.assert_allclose(
        change.forward(values.ravel()).reshape(valid.shape)[valid], expected[valid], rtol=1e-12
    )


def test_penalised_without_gaps_is_garcias_filter_in_the_cosine_domain():
    """z = IDCT(Gamma DCT(y)), Gamma = 1/(1 + s Lambda^2): Garcia (2010) eq. 8-10 (from memory)."""
    rng = np.random.default_rng(2)
    values = rng.normal(size=(12, 15))
    change = smoothing_map(lattice(12, 15), np.ones((12, 15), bool), method="penalised", values={"u": values})
    eigenvalues = np.add.outer(*(-2 + 2 * np.cos(np.pi * np.arange(n) / n) for n in (12, 15)))
    gain = 1 / (1 + change.strength * eigenvalues**2)
    expected = idctn(gain * dctn(values, norm="ortho"), norm="ortho")
    np.testing.assert_allclose(change.forward(values.ravel()).reshape(12, 15), expected, atol=1e-12)

    def score(s):
        gain = 1 / (1 + s * eigenvalues**2)
        misfit = ((idctn(gain * dctn(values, norm="ortho"), norm="ortho") - values) ** 2).sum()
        return misfit / values.size / (1 - gain.sum() / values.size) ** 2

    # the mean itself is not penalised, so that taking it away first changes nothing
    around = [score(change.strength * factor) for factor in (0.9, 1.0, 1.1)]
    assert around[1] <= min(around) * (1 + 1e-4) or change.strength > 9e5


def test_scaled_median_deviation():
    """1.4826 = 1/quantile(3/4) of the normal distribution; scipy.stats.median_abs_deviation."""
    assert pytest.approx(1 / norm.ppf(0.75), rel=1e-15) == MAD_TO_SIGMA
    values = np.random.default_rng(3).standard_t(3, size=(30, 31))
    found = spread_test(values, limit=4.0)
    expected = np.abs(values - np.median(values)) / median_abs_deviation(values, axis=None, scale="normal")
    np.testing.assert_allclose(found.residual, expected, rtol=1e-12)
