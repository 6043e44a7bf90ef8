"""Streaming moments against numpy and scipy with gaps, and in any order of merging."""

import numpy as np
import pytest
from scipy import stats

from fieldview.compute.errors import InputError
from fieldview.compute.moments import Moments

SHAPE = (5, 7)


def gappy_run(rng, count=40, share=0.2):
    u = rng.gamma(2.0, size=(count, *SHAPE)) + 3.0
    v = 0.4 * u + rng.normal(size=(count, *SHAPE)) - 7.0
    gaps = rng.random((count, *SHAPE)) < share
    return np.where(gaps, np.nan, u), np.where(gaps, np.nan, v)


def streamed(u, v) -> Moments:
    moments = Moments(("u", "v"), u.shape[1:])
    for one, other in zip(u, v, strict=True):
        moments.add({"u": one, "v": other})
    return moments


def test_moments_with_gaps_are_numpys_and_scipys():
    u, v = gappy_run(np.random.default_rng(1))
    found = streamed(u, v)
    du, dv = u - np.nanmean(u, axis=0), v - np.nanmean(v, axis=0)
    assert (found.count == np.isfinite(u).sum(axis=0)).all()
    for got, wanted in (
        (found.mean("u"), np.nanmean(u, axis=0)),
        (found.deviation("v"), np.nanstd(v, axis=0, ddof=1)),
        (found.covariance("u", "v"), np.nansum(du * dv, axis=0) / (found.count - 1)),
        (found.skewness("u"), stats.skew(u, axis=0, nan_policy="omit")),
        (found.kurtosis("v"), stats.kurtosis(v, axis=0, fisher=False, nan_policy="omit")),
        (found.central("u", "u", "v"), np.nanmean(du**2 * dv, axis=0)),
        (found.central("u", "v", "v"), np.nanmean(du * dv**2, axis=0)),
        (found.central("u", "v", "u", "v"), np.nanmean(du**2 * dv**2, axis=0)),
    ):
        np.testing.assert_allclose(got, np.asarray(wanted), rtol=1e-12)


@pytest.mark.parametrize("seed", range(3))
def test_the_order_of_merging_does_not_matter(seed):
    rng = np.random.default_rng(seed)
    u, v = gappy_run(rng, share=0.6)
    whole = streamed(u, v)
    cuts = np.sort(rng.choice(np.arange(1, len(u)), 6, replace=False))
    parts = [streamed(*pair) for pair in zip(np.split(u, cuts), np.split(v, cuts), strict=True)]
    merged = parts.pop(rng.integers(len(parts)))
    while parts:
        merged.merge(parts.pop(rng.integers(len(parts))))
    assert (merged.count == whole.count).all()
    for name in ("mean", "deviation", "skewness", "kurtosis"):
        got, wanted = getattr(merged, name)("u"), getattr(whole, name)("u")
        np.testing.assert_allclose(got, wanted, rtol=1e-12, atol=1e-12)
    np.testing.assert_allclose(
        merged.central("u", "u", "v", "v"), whole.central("u", "u", "v", "v"), rtol=1e-12
    )


def test_three_components():
    rng = np.random.default_rng(4)
    parts = dict(zip("uvw", rng.normal(size=(3, 30, 4)), strict=True))
    moments = Moments(("u", "v", "w"), (4,))
    for frame in range(30):
        moments.add({name: part[frame] for name, part in parts.items()})
    for a, b in (("u", "w"), ("v", "w"), ("w", "w")):
        wanted = [np.cov(parts[a][:, k], parts[b][:, k])[0, 1] for k in range(4)]
        np.testing.assert_allclose(moments.covariance(a, b), wanted, rtol=1e-12)


def test_a_node_without_samples_has_no_mean_and_one_sample_has_no_spread():
    moments = Moments(("u",), (2,))
    moments.add({"u": np.array([np.nan, 3.0])})
    assert np.isnan(moments.mean("u")[0]) and moments.mean("u")[1] == 3.0
    assert np.isnan(moments.deviation("u")).all()


def test_noise_variance_is_the_mean_over_the_samples():
    moments = Moments(("u",), (2,))
    moments.add({"u": np.array([1.0, np.nan])}, noise_variance={"u": np.array([0.1, 9.0])})
    moments.add({"u": np.array([1.0, 2.0])}, noise_variance={"u": np.array([0.3, 0.5])})
    np.testing.assert_allclose(moments.noise_variance("u"), [0.2, 0.5])
    moments.add({"u": np.array([1.0, np.nan])})
    assert np.isnan(moments.noise_variance("u")[0]) and moments.noise_variance("u")[1] == 0.5


def test_what_does_not_fit_is_refused():
    moments = Moments(("u",), (2,))
    with pytest.raises(InputError, match="all frames must be on one grid"):
        moments.add({"u": np.zeros(3)})
    with pytest.raises(InputError, match="another grid cannot be merged"):
        moments.merge(Moments(("u",), (3,)))
    with pytest.raises(InputError, match=r"moment of u·v·v·v is not kept"):
        Moments(("u", "v"), ()).central("u", "v", "v", "v")
