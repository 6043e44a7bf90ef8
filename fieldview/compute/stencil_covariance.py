"""What a scheme does to random errors far from edges and gaps, in closed form."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.grid import Grid
from fieldview.compute.lines import Line
from fieldview.compute.stencils import across_weights, scheme_named


@dataclass(frozen=True, eq=False)
class Stencil:
    """A scheme's own stencil at every node of a grid.

    Attributes
    ----------
    offsets : tuple of (int, int)
        Nodes taken, (dy, dx) from the node itself.
    weights : tuple of ndarray
        One for each, (ny or 1, nx or 1); 0 at nodes where the stencil reaches over the edge. [1/length]
    """

    offsets: tuple[tuple[int, int], ...]
    weights: tuple[np.ndarray, ...]

    def stands_on(self, nodes: np.ndarray) -> np.ndarray:
        """Where all nodes of the stencil are among these: bool (ny, nx) to the same."""
        reach = self.reach
        framed = np.pad(nodes, reach)
        return np.logical_and.reduce([_shifted(framed, offset, reach) for offset in self.offsets])

    @property
    def reach(self) -> int:
        return max(max(abs(dy), abs(dx)) for dy, dx in self.offsets)


def stencil(grid: Grid, functional: str, scheme: str) -> Stencil:
    """The stencil of "value" (the node itself), "x" or "y" (the derivative along that lattice axis)."""
    if functional == "value":
        return Stencil(((0, 0),), (np.ones((1, 1)),))
    rule = scheme_named(scheme)
    choice = rule.choices[0]
    line = Line(grid, functional, rule)
    along = [(step, weight) for step, weight in zip(choice.offsets, line.own_weights(choice), strict=True)]
    lanes = [(0, np.ones(1))]
    if rule.across:
        inner = across_weights(line.cross)
        lanes = [(step, np.pad(inner[:, k], 1)) for k, step in enumerate((-1, 0, 1))]
    offsets, weights = [], []
    for lane, share in lanes:
        for step, weight in along:
            offsets.append((lane, step) if line.is_x else (step, lane))
            product = share[:, None] * weight[None, :]
            weights.append(product if line.is_x else product.T)
    return Stencil(tuple(offsets), tuple(weights))


def closed_sum(
    first: Stencil, second: Stencil, sigma: np.ndarray, correlation: tuple[float, float]
) -> np.ndarray:
    """Covariance of two stencils' errors at every node, broadcastable to (ny, nx).

    The double sum over both stencils of weight, weight, sigma, sigma and correlation coefficient.

    Parameters
    ----------
    first, second : Stencil
    sigma : ndarray (ny, nx)
    correlation : (float, float)
        Nodes along x and y over which errors are correlated.
    """
    if sigma.size and np.ptp(sigma) == 0:
        return float(sigma.flat[0]) ** 2 * _double_sum(first, second, correlation, lambda offset: 1.0)
    reach = max(first.reach, second.reach)
    framed = np.pad(sigma, reach)
    return _double_sum(first, second, correlation, lambda offset: _shifted(framed, offset, reach))


def coefficient(lag: tuple[float, float], correlation: tuple[float, float]):
    """Correlation coefficient between nodes this far apart, (dy, dx) and (along x, along y): a triangle."""
    along_y = np.maximum(0.0, 1 - np.abs(lag[0]) / max(correlation[1], 1.0))
    along_x = np.maximum(0.0, 1 - np.abs(lag[1]) / max(correlation[0], 1.0))
    return along_y * along_x


def noise_gain(
    scheme: str, *, correlation: tuple[float, float] = (1.0, 1.0), quantity: str = "vorticity"
) -> float:
    """Standard uncertainty of a derivative quantity in units of sigma / spacing, far from gaps and edges.

    Parameters
    ----------
    scheme : str
    correlation : (float, float)
        Nodes along x and y over which errors are correlated.
    quantity : "vorticity", "divergence", "d_dx" or "d_dy"
        Errors of u and v are independent of each other and have the same sigma.
    """
    axes = {"vorticity": "xy", "divergence": "xy", "d_dx": "x", "d_dy": "y"}[quantity]
    grid = Grid(np.arange(9.0), np.arange(9.0))
    ones = np.ones(grid.shape)
    variances = []
    for axis in axes:
        own = stencil(grid, axis, scheme)
        variances.append(np.broadcast_to(closed_sum(own, own, ones, correlation), grid.shape)[4, 4])
    return float(np.sqrt(sum(variances)))


def _double_sum(first, second, correlation, sigma_at) -> np.ndarray:
    total = np.zeros((1, 1))
    for here, weight in zip(first.offsets, first.weights, strict=True):
        if not weight.any():
            continue
        inner = np.zeros((1, 1))
        for there, other in zip(second.offsets, second.weights, strict=True):
            rho = coefficient((here[0] - there[0], here[1] - there[1]), correlation)
            if rho > 0 and other.any():
                inner = inner + rho * other * sigma_at(there)
        total = total + weight * sigma_at(here) * inner
    return total


def _shifted(framed: np.ndarray, offset: tuple[int, int], reach: int) -> np.ndarray:
    """What stands this far from each node, from an array with a frame ``reach`` nodes wide."""
    ny, nx = framed.shape[0] - 2 * reach, framed.shape[1] - 2 * reach
    top, left = reach + offset[0], reach + offset[1]
    return framed[top : top + ny, left : left + nx]
