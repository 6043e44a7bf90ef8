"""Modes of fields whose modes are known, with and without gaps."""

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.compute.modes import decompose

NY, NX, FRAMES = 12, 16, 60
Y, X = np.mgrid[0:NY, 0:NX]


def orthonormal_modes(count=3, seed=1):
    """Smooth orthonormal pairs of (u, v) maps: (count, 2, NY, NX)."""
    waves = [
        np.cos((k + 1) * np.pi * (X + 0.5) / NX) * np.cos(k * np.pi * (Y + 0.5) / NY) for k in range(count)
    ]
    raw = np.stack([np.stack([wave, np.roll(wave, k, 1)]) for k, wave in enumerate(waves)]).reshape(count, -1)
    return np.linalg.qr(raw.T)[0].T.reshape(count, 2, NY, NX)


def low_rank_run(strengths=(9.0, 5.0, 2.0), sigma=0.0, seed=2):
    """Frames of a mean and modes whose coefficients are orthogonal, with these root mean squares."""
    rng = np.random.default_rng(seed)
    modes = orthonormal_modes(len(strengths))
    series = rng.normal(size=(FRAMES, len(strengths)))
    series = np.linalg.qr(series - series.mean(axis=0))[0] * np.sqrt(FRAMES) * strengths
    mean = np.stack([0.1 * X, -0.05 * Y])
    stack = mean + np.tensordot(series, modes, axes=1)
    return modes, stack + sigma * rng.normal(size=stack.shape)


def split(stack):
    return {"u": stack[:, 0], "v": stack[:, 1]}


def likeness(found, true):
    """Absolute inner product of two modes; 1 is the same mode, whatever its sign."""
    return abs(np.nansum(found * true))


def test_modes_of_a_low_rank_run_are_exact():
    modes, stack = low_rank_run()
    found = decompose(split(stack), count=5)
    assert found.modes.shape == (3, 2, NY, NX)
    np.testing.assert_allclose(found.energies, [81, 25, 4], rtol=1e-10)
    np.testing.assert_allclose(found.shares, np.array([81, 25, 4]) / 110, rtol=1e-10)
    for mine, true in zip(found.modes, modes, strict=True):
        assert likeness(mine, true) == pytest.approx(1, abs=1e-10)
    again = found.reconstruction(7)
    np.testing.assert_allclose(np.stack([again["u"], again["v"]]), stack[7], atol=1e-10)
    np.testing.assert_allclose(np.mean(found.coefficients**2, axis=0), found.energies, rtol=1e-10)


def test_the_modes_are_those_of_a_singular_value_decomposition():
    rng = np.random.default_rng(3)
    for frames in (20, 500):
        stack = rng.normal(size=(frames, 2, 6, 7))
        flat = (stack - stack.mean(axis=0)).reshape(frames, -1)
        _, strength, right = np.linalg.svd(flat, full_matrices=False)
        found = decompose(split(stack), count=4)
        np.testing.assert_allclose(found.energies[:15], strength[:15] ** 2 / frames, rtol=1e-9)
        for mine, true in zip(found.modes, right, strict=False):
            assert likeness(mine.reshape(-1), true) == pytest.approx(1, abs=1e-8)
        total = np.mean(np.sum(flat**2, axis=1))
        assert found.energies.sum() == pytest.approx(total, rel=1e-10)


def test_modes_with_a_fifth_of_the_vectors_missing():
    modes, stack = low_rank_run(sigma=0.05)
    gaps = np.random.default_rng(4).random((FRAMES, NY, NX)) < 0.2
    holed = np.where(gaps[:, None], np.nan, stack)
    found = decompose(split(holed), count=3)
    assert found.gap_modes == 3 and found.settled
    assert found.gap_share == pytest.approx(0.2, abs=0.01)
    assert found.gap_error == pytest.approx(0.05, rel=0.25)
    np.testing.assert_allclose(found.energies[:3], [81, 25, 4], rtol=0.03)
    for mine, true in zip(found.modes, modes, strict=True):
        assert likeness(mine, true) > 0.995
    rebuilt = found.reconstruction(11)
    hole = gaps[11]
    assert np.sqrt(np.mean((rebuilt["u"] - stack[11, 0])[hole] ** 2)) < 0.1
    # the plain way, gaps at the mean, loses a fifth of the amplitude
    plain = decompose(split(holed), count=3, gap_modes=0)
    assert plain.energies[0] < 0.9 * 81


def test_nodes_hardly_ever_measured_take_no_part():
    _, stack = low_rank_run()
    stack[:, :, 0, :] = np.nan
    stack[: int(0.8 * FRAMES), :, 5, 5] = np.nan
    found = decompose(split(stack), count=3)
    assert not found.nodes[0].any() and not found.nodes[5, 5] and found.nodes.sum() == (NY - 1) * NX - 1
    assert np.isnan(found.modes[:, :, 0]).all() and np.isfinite(found.modes[:, :, 1]).all()


def test_low_order_reconstruction_leaves_the_weaker_modes():
    _, stack = low_rank_run()
    found = decompose(split(stack))
    left = [
        np.mean(np.sum((found.reconstruction(n, count=1)["u"] - stack[n, 0]) ** 2)) for n in range(FRAMES)
    ]
    left_v = [np.sum((found.reconstruction(n, count=1)["v"] - stack[n, 1]) ** 2) for n in range(FRAMES)]
    assert np.mean(left) + np.mean(left_v) == pytest.approx(25 + 4, rel=1e-9)


def test_area_weights_make_a_finer_part_of_the_grid_count_no_more():
    """Doubling nodes at half the area each changes neither shares nor the shape of the modes."""
    _, stack = low_rank_run()
    doubled = np.repeat(stack, 2, axis=3)
    plain = decompose(split(stack)).shares
    again = decompose(split(doubled), weights=np.full((NY, 2 * NX), 0.5)).shares
    np.testing.assert_allclose(again[:3], plain[:3], rtol=1e-9)
    uneven = np.concatenate([stack, stack[:, :, :, -1:]], axis=3)
    area = np.ones((NY, NX + 1))
    area[:, -2:] = 0.5
    np.testing.assert_allclose(decompose(split(uneven), weights=area).shares[:3], plain[:3], rtol=1e-9)


def test_energies_scatter_as_said():
    """North et al.: relative sqrt(2/N) for normal coefficients; 300 runs tell it to 4 %."""
    rng = np.random.default_rng(5)
    mode = orthonormal_modes(1)
    found = []
    for _ in range(300):
        stack = np.tensordot(3 * rng.normal(size=(40, 1)), mode, axes=1)
        result = decompose(split(stack[:, :, :4]), count=1)
        found.append(result.energies[0])
    assert np.std(found) == pytest.approx(np.mean(found) * np.sqrt(2 / 40), rel=0.12)
    assert result.energy_uncertainty(40)[0] == pytest.approx(found[-1] * np.sqrt(2 / 40))


def test_what_cannot_be_decomposed_is_said():
    with pytest.raises(InputError, match="three frames or more"):
        decompose({"u": np.zeros((2, 3, 3))})
    with pytest.raises(InputError, match="no node is measured in 50 %"):
        decompose({"u": np.full((5, 3, 3), np.nan)})
    with pytest.raises(InputError, match="frame 60 is not among the 60"):
        decompose(split(low_rank_run()[1])).reconstruction(60)
