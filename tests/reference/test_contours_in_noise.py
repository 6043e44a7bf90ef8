"""Circulations of known vortices in noise, outliers and gaps: how often the truth lies within what is stated.

The vortex is that of Lamb and Oseen, circulation(r) = total (1 - exp(-r^2 / core^2)); textbooks of fluid
mechanics, from memory.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.ndimage import gaussian_filter

from fieldview.compute.error_model import ErrorModel, Systematic
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.region import measure_region
from fieldview.compute.shapes import circle
from fieldview.session import steps
from fieldview.session.ledger import apply_line


@dataclass
class OneFrame:
    """The run around a frame that stands alone."""

    sigma: float
    frame: int = 0
    rows_downward: bool = False

    def noise(self):
        return {"u": self.sigma, "v": self.sigma}


def swirl(x, y, *, core: float, centre: tuple[float, float]):
    """Velocity of a vortex of circulation 1."""
    dx, dy = x - centre[0], y - centre[1]
    r2 = np.maximum(dx**2 + dy**2, 1e-30)
    turn = -np.expm1(-r2 / core**2) / (2 * np.pi * r2)
    return -turn * dy, turn * dx


def spoiled(rng, u, v, *, outliers: float, missing: np.ndarray, reach: float):
    """With this share of vectors replaced by anything up to ``reach``, and some of them missing."""
    wrong = rng.random(u.shape) < outliers
    parts = [np.where(wrong, rng.uniform(-reach, reach, u.shape), part) for part in (u, v)]
    return [np.where(missing, np.nan, part) for part in parts]


def cleaned(field: Field, sigma: float) -> Field:
    """After a median test and a linear fill, as a session does it."""
    for line, step in enumerate((steps.MedianTest(floor=sigma), steps.Fill())):
        field, _ = apply_line(field, line, step, OneFrame(sigma))
    return field


def test_the_circulation_of_a_vortex_with_outliers_and_gaps():
    """8 cells a core, a contour of 1.6 core radii, 5 % outliers, 5 % missing, 2 % noise; 200 realisations."""
    rng = np.random.default_rng(20)
    core, axis = 8.0, np.arange(33.0)
    x, y = np.meshgrid(axis, axis)
    peak = 0.63817 / (2 * np.pi * core)
    sigma, radius = 0.02 * peak, 1.6 * core
    truth = -np.expm1(-(1.6**2))
    errors, spreads = [], []
    for _ in range(200):
        centre = tuple(16 + rng.uniform(-0.5, 0.5, 2))
        u, v = (part + rng.normal(0, sigma, x.shape) for part in swirl(x, y, core=core, centre=centre))
        u, v = spoiled(rng, u, v, outliers=0.05, missing=rng.random(x.shape) < 0.05, reach=1.5 * peak)
        error = ErrorModel(
            sigma={"u": sigma, "v": sigma},
            origin="given",
            correlation_stated=True,
            systematic=Systematic(0.0, 0.0, 0.0, 0.0, 0.0),
            window=(0.0, 0.0),
        )
        field = cleaned(Field(Grid(axis, axis), u=u, v=v, error=error), sigma)
        gamma = measure_region(field, circle(centre, radius)).circulation
        errors.append(gamma.value - truth)
        spreads.append(gamma.combined)
    ratio = np.array(errors) / np.array(spreads)
    assert abs(np.mean(errors)) < 0.006 * truth
    assert 0.8 < np.sqrt(np.mean(ratio**2)) < 1.6
    assert np.mean(np.abs(ratio) <= 3) >= 0.97


GAUSSIAN = 0.566
"""Width of a Gaussian filter whose noise is correlated over as many nodes as a triangle of two nodes."""


def bell_correlated(rng, shape, sigma: float) -> np.ndarray:
    """Noise with a bell-shaped correlation, where the error model assumes a triangle."""
    noise = gaussian_filter(rng.normal(size=(2, *shape)), (0, GAUSSIAN, GAUSSIAN), mode="wrap")
    return sigma * noise / noise.std()


def seen_through(window: float, x, y, **vortex):
    """Mean over the square window round every node, Gauss's rule of 3 x 3 points."""
    places, weights = np.polynomial.legendre.leggauss(3)
    total = np.zeros((2, *x.shape))
    for dx, wx in zip(0.5 * window * places, 0.5 * weights, strict=True):
        for dy, wy in zip(0.5 * window * places, 0.5 * weights, strict=True):
            total += wx * wy * np.array(swirl(x + dx, y + dy, **vortex))
    return total


def twin_ratios(count: int, seed: int) -> tuple[np.ndarray, np.ndarray]:
    """(value - truth) / combined uncertainty of circulation and flux on synthetic twins of a measurement.

    Windows of two nodes, noise of another correlation than assumed, outliers, gaps on the contour, a length
    scale and a pulse separation that are off by draws from their uncertainties. The contour is fixed to the
    field. Contours are those a careful user draws: outside the core, where the circulation levels off.
    """
    rng = np.random.default_rng(seed)
    axis, core, window = np.arange(45.0), 8.0, 2.0
    x, y = np.meshgrid(axis, axis)
    peak = 0.63817 / (2 * np.pi * core)
    sigma, u_scale, u_pulse = 0.03 * peak, 0.004, 0.003
    found = []
    for _ in range(count):
        centre = 22 + rng.uniform(-0.5, 0.5, 2)
        radius = core * rng.uniform(1.4, 2.4)
        truth = -np.expm1(-((radius / core) ** 2))
        scale, pulse = 1 + u_scale * rng.normal(), 1 + u_pulse * rng.normal()
        u, v = seen_through(window, x, y, core=core, centre=centre) + bell_correlated(rng, x.shape, sigma)
        missing = rng.random(x.shape) < 0.01
        for angle in rng.uniform(0, 2 * np.pi, 2):  # two gaps of two by two nodes on the contour
            ix, iy = (round(c + radius * f(angle)) for c, f in zip(centre, (np.cos, np.sin), strict=True))
            missing[iy : iy + 2, ix : ix + 2] = True
        u, v = spoiled(rng, u, v, outliers=0.02, missing=missing, reach=1.5 * peak)
        error = ErrorModel(
            sigma={"u": sigma, "v": sigma},
            origin="given",
            correlation=(2.0, 2.0),
            correlation_stated=True,
            systematic=Systematic(u_scale, u_pulse, 0.0, 0.0, 0.0),
            window=(window * scale, window * scale),
        )
        grid = Grid(axis * scale, axis * scale)
        field = cleaned(Field(grid, u=u * scale * pulse, v=v * scale * pulse, error=error), sigma)
        numbers = measure_region(field, circle(tuple(centre * scale), radius * scale))
        gamma, flux = numbers.circulation, numbers.flux
        found.append(((gamma.value - truth) / gamma.combined, flux.value / flux.combined))
    return tuple(np.array(found).T)


def test_combined_intervals_cover_the_truth_as_often_as_they_say():
    """300 twins, circulation and flux of each."""
    circulation, flux = twin_ratios(300, 31)
    both = np.concatenate([circulation, flux])
    for ratio in (circulation, both):
        assert 0.93 <= np.mean(np.abs(ratio) <= 1.96) <= 0.97
        assert 0.9 <= np.sqrt(np.mean(ratio**2)) <= 1.1
    # a flux that is none is never told apart from none too often
    assert np.mean(np.abs(flux) <= 1.96) >= 0.93
