"""The lattice seen along one of its two directions."""

from __future__ import annotations

import numpy as np

from fieldview.compute.grid import Grid
from fieldview.compute.stencils import Choice, Scheme, across_weights


class Line:
    """One of the lattice's two directions: neighbours and weights along it."""

    def __init__(self, grid: Grid, along: str):
        self.ny, self.nx = grid.shape
        self.is_x = along == "x"
        self.axis, self.cross = (grid.x, grid.y) if self.is_x else (grid.y, grid.x)
        self.is_uniform = grid.is_uniform[0 if self.is_x else 1]
        self.stride = 1 if self.is_x else self.nx

    def along(self, array: np.ndarray) -> np.ndarray:
        """A view of an array (ny, nx) whose last axis runs along this direction."""
        return array if self.is_x else array.T

    def first_choice(self, values: np.ndarray, rule: Scheme) -> np.ndarray:
        """The scheme's own stencil, NaN where it reaches over the edge or a NaN."""
        slope = np.empty(values.shape)
        self._apply(rule.choices[0], self.along(values), self.along(slope))
        if not rule.across:
            return slope
        slope[np.isnan(values)] = np.nan
        return _averaged_across(slope, self.cross, self.is_x)

    def _apply(self, choice: Choice, source: np.ndarray, target: np.ndarray) -> None:
        size = self.axis.size
        low, high = -choice.first, size - choice.last
        target[:, : min(low, size)] = np.nan
        target[:, max(high, 0) :] = np.nan
        if high <= low:
            return
        inner = target[:, low:high]
        nodes = np.arange(low, high)
        weights = self._uniform(choice)[None, :] if self.is_uniform else choice.weights(self.axis, nodes)
        shifted = [source[:, low + k : high + k] for k in range(choice.first, choice.last + 1)]
        if self.is_uniform:
            _antisymmetric_sum(shifted, weights[0], inner)
        else:
            _weighted_sum(shifted, weights, inner)

    def own_weights(self, choice: Choice) -> np.ndarray:
        """Weights (count, size) of a stencil at every place of the axis, 0 where it does not fit."""
        size = self.axis.size
        weights = np.zeros((choice.count, size))
        low, high = -choice.first, size - choice.last
        if high > low:
            nodes = np.arange(low, high)
            inner = self._uniform(choice)[None, :] if self.is_uniform else choice.weights(self.axis, nodes)
            weights[:, low:high] = inner.T
        return weights

    def _uniform(self, choice: Choice) -> np.ndarray:
        """Weights (count,) on an evenly spaced axis."""
        spacing = (self.axis[-1] - self.axis[0]) / max(self.axis.size - 1, 1) or 1.0
        return _unit_weights(choice) / spacing

    def weights(self, choice: Choice, flat: np.ndarray) -> np.ndarray:
        """Weights (k, count) at flat nodes, all of which the stencil fits."""
        if self.is_uniform:
            return np.broadcast_to(self._uniform(choice), (flat.size, choice.count))
        positions = self.position(flat)
        there, which = np.unique(positions, return_inverse=True)
        return choice.weights(self.axis, there)[which]

    def position(self, flat: np.ndarray) -> np.ndarray:
        return flat % self.nx if self.is_x else flat // self.nx

    def members(self, flat: np.ndarray, choice: Choice) -> tuple[np.ndarray, np.ndarray]:
        """Which of the nodes the stencil fits, bool (k,), and its flat nodes for those, (fitting, count)."""
        position = self.position(flat)
        inside = (position + choice.first >= 0) & (position + choice.last < self.axis.size)
        steps = np.arange(choice.first, choice.last + 1) * self.stride
        return inside, flat[inside][:, None] + steps


def _unit_weights(choice: Choice) -> np.ndarray:
    """Weights (count,) on an axis of spacing 1, with round-off that stands for zero removed."""
    axis = np.arange(float(choice.count)) + choice.first
    weights = choice.weights(axis, np.array([-choice.first]))[0]
    return np.where(np.abs(weights) < 1e-12, 0.0, weights)


def _antisymmetric_sum(shifted, weights, out) -> None:
    """Sum of an odd number of shifted arrays with weights that are antisymmetric about the middle."""
    half = len(shifted) // 2
    spare = None
    for k in range(1, half + 1):
        term = out if k == 1 else spare
        if term is None:
            spare = term = np.empty_like(out)
        np.subtract(shifted[half + k], shifted[half - k], out=term)
        term *= weights[half + k]
        if term is not out:
            out += term


def _weighted_sum(shifted, weights, out) -> None:
    """Sum of shifted arrays with weights (nodes, count) along their last axis."""
    np.multiply(shifted[0], weights[:, 0], out=out)
    spare = np.empty_like(out)
    for k in range(1, len(shifted)):
        np.multiply(shifted[k], weights[:, k], out=spare)
        out += spare


def _averaged_across(slope: np.ndarray, cross: np.ndarray, is_x: bool) -> np.ndarray:
    """Average of each line's slope with its two neighbours'; NaN at the first and last line."""
    lines = slope if is_x else slope.T
    averaged = np.full(slope.shape, np.nan)
    if cross.size > 2:
        weights = across_weights(cross)
        target = averaged if is_x else averaged.T
        target[1:-1] = sum(lines[k : cross.size - 2 + k] * weights[:, k, None] for k in range(3))
    return averaged
