"""Autocorrelation in one pass, merged in pieces, and what correlated samples are worth."""

import numpy as np
import pytest
from scipy.signal import lfilter

from fieldview.compute.lag_window import Correlation, LagWindow, Thinning


def window_of(series, lags=10) -> LagWindow:
    window = LagWindow(("u",), series.shape[1], lags=lags)
    for values in series:
        window.add({"u": values})
    return window


def plain_correlation(series, lags):
    """Straight from the definition, over the pairs that are there."""
    away = series - np.nanmean(series, axis=0)
    covariance = [np.nanmean(away[: len(away) - k] * away[k:], axis=0) for k in range(lags + 1)]
    return np.array(covariance) / covariance[0]


def ar1(rng, count, nodes, phi=0.8):
    start = rng.normal(size=(1, nodes)) / np.sqrt(1 - phi**2)
    steps = np.concatenate([start, rng.normal(size=(count - 1, nodes))])
    return lfilter([1.0], [1.0, -phi], steps, axis=0)


@pytest.mark.parametrize("offset", [0.0, 1e4])
def test_correlation_with_gaps_is_that_of_the_definition(offset):
    rng = np.random.default_rng(2)
    series = ar1(rng, 200, 6) + offset + np.arange(6)
    series[rng.random(series.shape) < 0.2] = np.nan
    rho = window_of(series).correlation({"u": np.nanmean(series, axis=0)}).rho["u"]
    np.testing.assert_allclose(rho, plain_correlation(series, 10), atol=1e-11 * max(1.0, offset))


@pytest.mark.parametrize("cuts", [(5,), (50, 53, 54, 120), (199,), (10, 20, 30)])
def test_pieces_merged_in_order_of_time_are_the_whole(cuts):
    rng = np.random.default_rng(3)
    series = ar1(rng, 200, 4) + 5.0
    series[rng.random(series.shape) < 0.3] = np.nan
    mean = {"u": np.nanmean(series, axis=0)}
    pieces = [window_of(part) for part in np.split(series, cuts)]
    # neighbours may be merged in any order
    while len(pieces) > 1:
        at = int(rng.integers(len(pieces) - 1))
        pieces[at].merge(pieces.pop(at + 1))
    whole = window_of(series)
    np.testing.assert_allclose(
        pieces[0].correlation(mean).rho["u"], whole.correlation(mean).rho["u"], atol=1e-12
    )
    # and it can go on from there
    for more in series[:15]:
        pieces[0].add({"u": more})
        whole.add({"u": more})
    np.testing.assert_allclose(
        pieces[0].correlation(mean).rho["u"], whole.correlation(mean).rho["u"], atol=1e-12
    )


def test_known_correlation_gives_the_exact_worth():
    """AR(1) with phi = 0.8: N_eff = 0.111 N for the mean and 0.220 N for the variance (closed form)."""
    phi = 0.8
    worth = Correlation({"u": phi ** np.arange(200.0)[:, None]})
    assert 1 / worth.inflation("u")[0] == pytest.approx((1 - phi) / (1 + phi), rel=1e-9)
    assert 1 / worth.inflation("u")[0] == pytest.approx(0.111, abs=5e-4)
    assert 1 / worth.inflation("u", "u")[0] == pytest.approx(0.220, abs=5e-4)
    assert not worth.falls_to_zero("u")[0]


def test_worth_of_ar1_samples_within_its_sampling_error():
    """The same from series of 4,000 samples at 400 nodes; stopping at the first zero adds some 3 %."""
    series = ar1(np.random.default_rng(5), 4000, 400)
    worth = window_of(series, lags=60).correlation({"u": series.mean(axis=0)})
    assert worth.falls_to_zero("u").mean() > 0.95
    assert np.mean(worth.inflation("u")) == pytest.approx(9.0, rel=0.05)
    assert np.mean(worth.inflation("u", "u")) == pytest.approx(1 / 0.2195, rel=0.05)
    # the spread of the means themselves is what the worth promises: 400 means tell it to 3.5 %
    promised = np.sqrt(np.mean(series.var(axis=0) * worth.inflation("u") / 4000))
    assert series.mean(axis=0).std() == pytest.approx(promised, rel=0.11)


def test_too_few_pairs_are_not_known():
    series = np.random.default_rng(1).normal(size=(30, 2))
    series[::2, 1] = np.nan
    found = window_of(series, lags=3).correlation({"u": np.nanmean(series, axis=0)})
    assert list(found.known("u")) == [True, False]
    assert np.isnan(found.inflation("u")[1])


def test_thinning_takes_few_nodes_and_spreads_them_back():
    thinning = Thinning((50, 70), most=200)
    x = np.broadcast_to(np.arange(70.0), (50, 70))
    taken = thinning.thin(x)
    assert taken.size == thinning.size <= 250
    assert np.abs(thinning.spread(taken) - x).max() <= thinning.step
    taken[3] = np.nan
    assert np.isfinite(thinning.spread(taken)).all()


def test_a_spread_map_is_the_mean_of_nine_and_keeps_what_is_linear():
    whole = Thinning((6, 7))
    x, y = np.meshgrid(np.arange(7.0), np.arange(6.0))
    found = whole.spread(whole.thin(2 * x - y))
    np.testing.assert_allclose(found[1:-1, 1:-1], (2 * x - y)[1:-1, 1:-1], atol=1e-12)
    assert found[0, 0] == pytest.approx(np.mean((2 * x - y)[:2, :2]))
    holed = whole.thin(np.where(x == 3, np.nan, 1.0))
    np.testing.assert_allclose(whole.spread(holed), 1.0)
    assert np.isnan(whole.spread(np.full(42, np.nan))).all()


def test_most_of_the_bias_of_a_short_run_is_taken_off():
    """AR(1), phi = 0.8, 100 samples: without it far lags are too low by 1 / N_eff = 0.09."""
    series = ar1(np.random.default_rng(6), 100, 2000)
    plain = window_of(series, lags=20).correlation({"u": series.mean(axis=0)})
    better = plain.corrected(np.full(2000, 100))
    true = 0.8 ** np.arange(21)
    left_plain, left = (found.rho["u"].mean(axis=1) - true for found in (plain, better))
    assert left_plain[10:].max() < -0.06 and np.abs(left[1:]).max() < 0.05
    assert np.abs(left[15:]).max() < 0.4 * np.abs(left_plain[15:]).max()
    assert (better.rho["u"][0] == 1).all()
