"""Smoothing: what it keeps, what it does at gaps, and the map it is."""

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.compute.penalised import GCV_NOTE, PenalisedMap
from fieldview.compute.smoothing import METHODS, smoothing_map
from tests.compute.flows import lattice, vortex

WIDTHS = {"gaussian": 1.2, "savitzky_golay": 5, "penalised": 6.0}


def smoothed(change, values, valid):
    return change.forward(np.where(valid, values, 0.0).ravel()).reshape(valid.shape)


@pytest.fixture
def gappy():
    rng = np.random.default_rng(0)
    grid = lattice(14, 17)
    valid = rng.random(grid.shape) > 0.15
    valid[6:9, 5:9] = False
    return grid, valid, rng.normal(size=grid.shape)


@pytest.mark.parametrize("method", METHODS)
def test_constants_stay_and_nothing_is_made_where_there_is_nothing(method, gappy):
    grid, valid, _ = gappy
    change = smoothing_map(grid, valid, method=method, width=WIDTHS[method])
    found = smoothed(change, np.full(grid.shape, 3.0), valid)
    np.testing.assert_allclose(found[valid], 3.0, rtol=1e-8)
    assert (found[~valid] == 0).all()


@pytest.mark.parametrize("method", METHODS)
def test_values_at_invalid_nodes_do_not_matter(method, gappy):
    grid, valid, values = gappy
    change = smoothing_map(grid, valid, method=method, width=WIDTHS[method])
    other = np.where(valid, values, 1e6)
    np.testing.assert_array_equal(change.forward(values.ravel()), change.forward(other.ravel()))


@pytest.mark.parametrize("method", METHODS)
def test_transpose_and_rows_belong_to_the_same_matrix(method, gappy):
    grid, valid, values = gappy
    change = smoothing_map(grid, valid, method=method, width=WIDTHS[method])
    weights = np.random.default_rng(1).normal(size=valid.size)
    forward = weights @ change.forward(values.ravel())
    assert change.transpose(weights) @ values.ravel() == pytest.approx(forward, rel=1e-8)
    nodes = np.array([0, 40, 100])
    rows = change.rows(nodes)
    np.testing.assert_allclose(rows @ values.ravel(), change.forward(values.ravel())[nodes], atol=1e-8)
    pair = np.column_stack([values.ravel(), weights])
    np.testing.assert_allclose(change.forward(pair)[:, 1], change.forward(weights), atol=1e-9)
    assert change.exact


def test_gaussian_is_the_normalised_convolution(gappy):
    grid, valid, values = gappy
    change = smoothing_map(grid, valid, width=0.9)
    iy, ix = 5, 9
    jy, jx = np.nonzero(valid)
    weights = np.exp(-0.5 * ((jy - iy) ** 2 + (jx - ix) ** 2) / 0.9**2)
    weights[np.maximum(np.abs(jy - iy), np.abs(jx - ix)) > 4] = 0
    expected = (weights * values[jy, jx]).sum() / weights.sum() if valid[iy, ix] else 0
    assert smoothed(change, values, valid)[iy, ix] == pytest.approx(expected)


def test_savitzky_golay_keeps_parabolas_across_gaps_and_uneven_axes():
    grid = lattice(12, 13, even=False)
    valid = np.random.default_rng(3).random(grid.shape) > 0.1
    x, y = grid.x[None, :], grid.y[:, None]
    values = (1 + x - x**2) * np.ones_like(y) + (2 * y + y**2)
    change = smoothing_map(grid, valid, method="savitzky_golay", width=7)
    found = smoothed(change, values, valid)
    np.testing.assert_allclose(found[valid], values[valid], atol=1e-10)


def test_penalised_halves_its_wavelength():
    grid = lattice(3, 96)
    values = np.cos(np.pi * (np.arange(96) + 0.5) / 96 * 16) + np.zeros((3, 1))
    change = smoothing_map(grid, np.ones(grid.shape, bool), method="penalised", width=12.0)
    np.testing.assert_allclose(change.forward(values.ravel()).reshape(3, 96), 0.5 * values, atol=1e-12)


def test_penalised_matrix_is_the_same_as_the_solver(gappy):
    _, valid, values = gappy
    change = PenalisedMap(valid, 3.0)
    np.testing.assert_allclose(change.matrix @ values.ravel(), change.forward(values.ravel()), atol=1e-8)


@pytest.mark.parametrize("share", [0.0, 0.1])
def test_cross_validation_comes_close_to_the_best_strength(share):
    """Error of the chosen smoothing within 10 % of the least over all strengths, and below half the noise."""
    rng = np.random.default_rng(5)
    grid = lattice(48, 48)
    exact = vortex(grid, core=3.0, centre=9 + 11j).u
    values = exact + 0.1 * rng.normal(size=grid.shape)
    valid = rng.random(grid.shape) >= share
    change = smoothing_map(grid, valid, method="penalised", values={"u": np.where(valid, values, np.nan)})
    assert change.note == GCV_NOTE and change.exact

    def error(strength):
        found = smoothed(PenalisedMap(valid, strength), values, valid)
        return np.sqrt(((found - exact)[valid] ** 2).mean())

    least = min(error(strength) for strength in 10.0 ** np.arange(-2, 4, 0.25))
    assert error(change.strength) < 1.1 * least
    assert error(change.strength) < 0.05


@pytest.mark.parametrize(
    ("method", "width", "message"),
    [
        ("savitzky_golay", 4, "Savitzky-Golay smoothing is 4; give an odd number"),
        ("gaussian", -1.0, "width of a smoothing is -1.0; give a positive number"),
        ("penalised", 1.0, "wavelength of a penalised smoothing is 1.0; give 2 nodes or more"),
        ("penalised", None, "needs the components' values"),
        ("boxcar", 3.0, 'smoothing "boxcar" is not known; the methods are: gaussian'),
    ],
)
def test_what_makes_no_sense_is_refused(method, width, message):
    grid = lattice(6, 6)
    with pytest.raises(InputError, match=message):
        smoothing_map(grid, np.ones(grid.shape, bool), method=method, width=width)
