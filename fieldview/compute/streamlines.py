"""Streamlines of one frame through chosen points, both ways."""

from __future__ import annotations

import numpy as np

from fieldview.compute.field import Field

STEP = 0.25
"""Arc length of a step, in the smallest node spacing."""


def streamlines(field: Field, seeds, *, longest: float = 4.0) -> list[np.ndarray]:
    """The streamline through every seed, from where it comes to where it goes.

    The velocity between nodes is the bilinear interpolant of the cell, as for the line integrals; steps of a
    quarter spacing along the direction of flow are taken by the classical fourth-order Runge-Kutta rule. A
    line ends at the edge, at a cell with a corner without a vector, where the flow stands still, after
    ``longest`` times the grid's half perimeter, or where it has come back to its seed.

    Parameters
    ----------
    field : Field
    seeds : iterable of complex
        Points in the plane. [length]

    Returns
    -------
    list of complex ndarray (n,)
        One for each seed, in plane coordinates; empty for a seed where there is no velocity.
    """
    seeds = np.array(list(seeds), complex)
    if not field.in_plane or not field.grid.is_plane or seeds.size == 0:
        return [np.zeros(0, complex) for _ in seeds]
    grid = field.grid
    start = np.asarray(grid.placement.to_lattice(seeds), complex)
    velocity = grid.placement.vector_to_lattice(field.u + 1j * field.v)
    step = STEP * min(float(np.diff(axis).min()) for axis in (grid.x, grid.y))
    most = int(longest * (np.ptp(grid.x) + np.ptp(grid.y)) / step)
    forth = _march(grid, velocity, start, step, most)
    back = _march(grid, -velocity, start, step, most)
    joined = []
    for place, ahead, behind in zip(start, forth, back, strict=True):
        closed = len(ahead) > 2 and abs(ahead[-1] - place) < step
        parts = [place, *ahead] if closed else [*behind[::-1], place, *ahead]
        joined.append(grid.placement.to_plane(np.array(parts)) if len(parts) > 1 else np.zeros(0, complex))
    return joined


def _march(grid, velocity, start, step, most) -> list[list[complex]]:
    """Places after each step from every start, until a line ends."""
    lines: list[list[complex]] = [[] for _ in start]
    at, alive = start.copy(), np.arange(start.size)
    still = 1e-9 * np.nanmax(np.abs(velocity), initial=0.0)
    for number in range(most):
        here = at[alive]
        k1 = _direction(grid, velocity, here, still)
        k2 = _direction(grid, velocity, here + 0.5 * step * k1, still)
        k3 = _direction(grid, velocity, here + 0.5 * step * k2, still)
        k4 = _direction(grid, velocity, here + step * k3, still)
        there = here + step / 6 * (k1 + 2 * k2 + 2 * k3 + k4)
        on = np.isfinite(there)
        alive, there = alive[on], there[on]
        at[alive] = there
        for line, place in zip(alive, there, strict=True):
            lines[line].append(complex(place))
        if number > 3 / STEP:
            alive = alive[np.abs(there - start[alive]) >= 0.6 * step]
        if alive.size == 0:
            break
    return lines


def _direction(grid, velocity, at, still) -> np.ndarray:
    """Unit vector of the flow at places of the lattice; NaN where there is none."""
    x, y = at.real, at.imag
    inside = (x >= grid.x[0]) & (x <= grid.x[-1]) & (y >= grid.y[0]) & (y <= grid.y[-1])
    x, y = np.where(inside, x, grid.x[0]), np.where(inside, y, grid.y[0])
    ix = np.clip(np.searchsorted(grid.x, x, side="right") - 1, 0, grid.x.size - 2)
    iy = np.clip(np.searchsorted(grid.y, y, side="right") - 1, 0, grid.y.size - 2)
    s = (x - grid.x[ix]) / (grid.x[ix + 1] - grid.x[ix])
    t = (y - grid.y[iy]) / (grid.y[iy + 1] - grid.y[iy])
    below = (1 - s) * velocity[iy, ix] + s * velocity[iy, ix + 1]
    above = (1 - s) * velocity[iy + 1, ix] + s * velocity[iy + 1, ix + 1]
    found = (1 - t) * below + t * above
    speed = np.abs(found)
    moving = inside & (speed > still)
    return np.where(moving, found / np.where(moving, speed, 1.0), np.nan)
