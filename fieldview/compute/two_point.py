"""Two-point correlation of the fluctuation about a reference node, and the length over which it lasts."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.grid import Grid

FEWEST_SAMPLES = 8


class TwoPoint:
    """Correlation between one component at a reference node and one at every node, frame by frame.

    Only frames in which the reference and the other node both have a value count, node by node. Partial
    results merge in any order.

    Parameters
    ----------
    node : (int, int)
        Reference, (iy, ix).
    shape : (int, int)
    """

    def __init__(self, node: tuple[int, int], shape: tuple[int, int]):
        if not (0 <= node[0] < shape[0] and 0 <= node[1] < shape[1]):
            raise InputError(
                f"the reference node {tuple(node)} is outside the grid of {shape[0]} rows "
                f"and {shape[1]} columns"
            )
        self.node = tuple(node)
        self.count = np.zeros(shape, np.int64)
        self._here, self._there = np.zeros(shape), np.zeros(shape)
        self._square_here, self._square_there, self._product = (np.zeros(shape) for _ in range(3))

    def add(self, at_reference: np.ndarray, elsewhere: np.ndarray | None = None) -> None:
        """One frame: the component at the reference (ny, nx), and the other one; the same if left out."""
        here = float(at_reference[self.node])
        if not np.isfinite(here):
            return
        there = np.asarray(at_reference if elsewhere is None else elsewhere, float)
        valid = np.isfinite(there)
        values = (np.where(valid, here, 0.0), np.where(valid, there, 0.0))
        self._combine(valid.astype(np.int64), *values, 0.0, 0.0, 0.0)

    def merge(self, other: TwoPoint) -> None:
        if other.node != self.node or other.count.shape != self.count.shape:
            raise InputError("two-point correlations about different nodes cannot be merged")
        self._combine(
            other.count, other._here, other._there, other._square_here, other._square_there, other._product
        )

    def coefficient(self) -> np.ndarray:
        """Correlation coefficient (ny, nx); NaN below eight samples."""
        with np.errstate(divide="ignore", invalid="ignore"):
            rho = self._product / np.sqrt(self._square_here * self._square_there)
        return np.where(self.count >= FEWEST_SAMPLES, rho, np.nan)

    def uncertainty(self, inflation: float = 1.0) -> np.ndarray:
        """Standard uncertainty of the coefficient (ny, nx), (1 - rho^2) / sqrt(N_eff), large samples.

        ``inflation`` is N / N_eff, from the correlation in time. Source: Fisher (1915) Biometrika 10:507-521
        (from memory).
        """
        return (1 - self.coefficient() ** 2) * np.sqrt(inflation / np.maximum(self.count, 1))

    def _combine(self, count, here, there, square_here, square_there, product) -> None:
        total = self.count + count
        share = count / np.maximum(total, 1)
        step_here, step_there = here - self._here, there - self._there
        weight = self.count * share
        self._here = self._here + share * step_here
        self._there = self._there + share * step_there
        self._square_here = self._square_here + square_here + weight * step_here**2
        self._square_there = self._square_there + square_there + weight * step_there**2
        self._product = self._product + product + weight * step_here * step_there
        self.count = total


@dataclass(frozen=True)
class IntegralLength:
    """Integral of a correlation coefficient outward from the reference to its first zero.

    Attributes
    ----------
    length : float
        [length]
    uncertainty : float
        Standard, from the coefficient's along the way, taken as fully correlated. [length]
    ends : str
        "zero" where the coefficient falls to zero; "edge" or "gap" where the grid or the measured nodes end
        before, so that the length is a lower bound.
    """

    length: float
    uncertainty: float
    ends: str


def integral_length(
    coefficient: np.ndarray, uncertainty: np.ndarray, grid: Grid, node: tuple[int, int], *, along: str
) -> IntegralLength:
    """Integral length from a reference node along "+x", "-x", "+y" or "-y" of the lattice, by trapezia.

    Parameters
    ----------
    coefficient, uncertainty : ndarray (ny, nx)
        From `TwoPoint`.
    grid : Grid
    node : (int, int)
        The reference, (iy, ix).
    along : str
    """
    if along not in ("+x", "-x", "+y", "-y"):
        raise InputError(f'the direction is "{along}"; write +x, -x, +y or -y')
    axis, step = (grid.x, 1) if along[1] == "x" else (grid.y, 0)
    line, spread = (part[node[0]] if step else part[:, node[1]] for part in (coefficient, uncertainty))
    start = node[step]
    backward = along[0] == "-"
    places = slice(start, None, -1) if backward else slice(start, None)
    distance, rho, u = np.abs(axis[places] - axis[start]), line[places], spread[places]
    if not np.isfinite(rho[0]):
        raise InputError(f"the reference node {tuple(node)} is measured in too few frames for a correlation")
    below = np.flatnonzero(~(rho > 0))
    if not below.size:
        return IntegralLength(_area(distance, rho), _area(distance, u), "edge")
    end = int(below[0])
    length, width = _area(distance[:end], rho[:end]), _area(distance[:end], u[:end])
    if not np.isfinite(rho[end]):
        return IntegralLength(length, width, "gap")
    # the last piece is the triangle up to where the line between the two nodes crosses zero
    reach = (distance[end] - distance[end - 1]) * rho[end - 1] / (rho[end - 1] - rho[end])
    return IntegralLength(
        float(length + 0.5 * reach * rho[end - 1]), float(width + 0.5 * reach * u[end - 1]), "zero"
    )


def _area(distance: np.ndarray, values: np.ndarray) -> float:
    return float(np.sum(0.5 * (values[1:] + values[:-1]) * np.diff(distance)))
