"""Exact flows and random errors that the tests of computing share."""

from __future__ import annotations

import numpy as np

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid


def uneven(rng, size: int, spacing: float = 1.0) -> np.ndarray:
    """An axis whose spacing varies by a third."""
    return np.cumsum(spacing * rng.uniform(0.75, 1.25, size))


def lattice(ny: int, nx: int, *, even: bool = True, seed: int = 0) -> Grid:
    rng = np.random.default_rng(seed)
    if even:
        return Grid(np.arange(nx) * 0.5 - 3.0, np.arange(ny) * 0.4 + 2.0)
    return Grid(uneven(rng, nx, 0.5), uneven(rng, ny, 0.4))


def linear_field(grid: Grid, gradient, *, missing=None, **attributes) -> Field:
    """u and v linear in the plane's coordinates: gradient is ((ux, uy), (vx, vy))."""
    z = grid.nodes
    (ux, uy), (vx, vy) = gradient
    u = 1.0 + ux * z.real + uy * z.imag
    v = -2.0 + vx * z.real + vy * z.imag
    if missing is not None:
        u, v = np.where(missing, np.nan, u), np.where(missing, np.nan, v)
    return Field(grid, u=u, v=v, **attributes)


def vortex(
    grid: Grid, *, core: float, centre: complex, peak: float = 1.0, missing=None, **attributes
) -> Field:
    """Lamb-Oseen vortex with this peak speed."""
    arm = grid.nodes - centre
    square = np.abs(arm) ** 2
    rate = -np.expm1(-square / core**2) / np.maximum(square, 1e-30)
    rate = np.where(square == 0, 1 / core**2, rate) * peak * core / 0.63817
    velocity = 1j * arm * rate
    if missing is not None:
        velocity = np.where(missing, np.nan, velocity)
    return Field(
        grid, u=velocity.real, v=np.where(np.isnan(velocity.real), np.nan, velocity.imag), **attributes
    )


def correlated_noise(rng, shape: tuple[int, int], nodes: tuple[int, int], count: int = 1) -> np.ndarray:
    """Errors (count, ny, nx) of standard deviation 1, correlated as a triangle of these nodes (x, y)."""
    mx, my = nodes
    white = rng.normal(size=(count, shape[0] + my - 1, shape[1] + mx - 1))
    rows = sum(white[:, j : j + shape[0]] for j in range(my))
    return sum(rows[:, :, i : i + shape[1]] for i in range(mx)) / np.sqrt(mx * my)


def stated(sigma, *, correlation=(1, 1), **more) -> ErrorModel:
    sigma = sigma if isinstance(sigma, dict) else {"u": sigma, "v": sigma}
    return ErrorModel(sigma=sigma, origin="given", correlation=correlation, correlation_stated=True, **more)
