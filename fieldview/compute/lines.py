"""The lattice seen along one of its two directions."""

from __future__ import annotations

from functools import cache

import numpy as np

from fieldview.compute.grid import Grid
from fieldview.compute.stencils import Choice, Scheme, across_weights

_BLOCK_NODES = 32_000
"""Nodes worked on at a time, so that every pass but the first finds them in the cache."""


class Line:
    """One of the lattice's two directions: neighbours and weights along it."""

    def __init__(self, grid: Grid, along: str):
        self.ny, self.nx = grid.shape
        self.is_x = along == "x"
        self.axis, self.cross = (grid.x, grid.y) if self.is_x else (grid.y, grid.x)
        self.is_uniform = grid.is_uniform[0 if self.is_x else 1]
        self.stride = 1 if self.is_x else self.nx

    def first_choice(self, values: np.ndarray, rule: Scheme) -> np.ndarray:
        """The scheme's own stencil, NaN where it reaches over the edge or a NaN."""
        slope = np.empty(values.shape)
        choice = rule.choices[0]
        low, high = self._span(choice)
        if high > low:
            self._apply(choice, values, slope)
        self._at(slope, slice(0, min(low, self.axis.size)))[...] = np.nan
        self._at(slope, slice(max(high, low, 0), None))[...] = np.nan
        if not rule.across:
            return slope
        slope[np.isnan(values)] = np.nan
        return _averaged_across(slope, self.cross, self.is_x)

    def settle_edges(self, values: np.ndarray, slope: np.ndarray, rule: Scheme) -> np.ndarray:
        """Gives the places at the ends of the axis their best stencil; returns their flat nodes."""
        low, high = self._span(rule.choices[0])
        size = self.axis.size
        ends = [place for place in range(size) if not low <= place < high]
        for place in ends:
            for choice in rule.choices[1:]:
                first, stop = self._span(choice)
                if first <= place < stop:
                    weights = self._weights_at(choice, np.array([place]))[0]
                    sides = [self._at(values, place + k) for k in choice.offsets]
                    terms = [w * side for w, side in zip(weights, sides, strict=True)]
                    self._at(slope, place)[...] = sum(terms)
                    break
        starts = np.arange(self.ny) * self.nx if self.is_x else np.arange(self.nx)
        return (np.array(ends, np.intp)[:, None] * self.stride + starts).ravel()

    def _span(self, choice: Choice) -> tuple[int, int]:
        """Places [low, high) of the axis that the stencil fits."""
        return -choice.first, self.axis.size - choice.last

    def _at(self, array: np.ndarray, places) -> np.ndarray:
        """The part of an array (ny, nx) at these places of the axis."""
        return array[:, places] if self.is_x else array[places]

    def _apply(self, choice: Choice, values: np.ndarray, slope: np.ndarray) -> None:
        """The stencil's sum over values (ny, nx) into the slope, of no meaning where it does not fit."""
        low, high = self._span(choice)
        weights = self._weights_at(choice, np.arange(low, high))
        if not self.is_uniform:
            shifted = [self._at(values, slice(low + k, high + k)) for k in choice.offsets]
            columns = weights.T[:, None, :] if self.is_x else weights.T[:, :, None]
            _weighted_sum(shifted, columns, self._at(slope, slice(low, high)))
            return
        # even spacing: as one long line, which runs on from row to row, over what the ends overwrite later
        flat, target = values.ravel(), slope.ravel()
        start, stop = -choice.first * self.stride, flat.size - choice.last * self.stride
        for first in range(start, stop, _BLOCK_NODES):
            last = min(first + _BLOCK_NODES, stop)
            parts = [flat[first + k * self.stride : last + k * self.stride] for k in choice.offsets]
            _antisymmetric_sum(parts, weights[0], target[first:last])

    def own_weights(self, choice: Choice) -> np.ndarray:
        """Weights (count, size) of a stencil at every place of the axis, 0 where it does not fit."""
        weights = np.zeros((choice.count, self.axis.size))
        low, high = self._span(choice)
        if high > low:
            weights[:, low:high] = self._weights_at(choice, np.arange(low, high)).T
        return weights

    def _uniform(self, choice: Choice) -> np.ndarray:
        """Weights (count,) on an evenly spaced axis."""
        spacing = (self.axis[-1] - self.axis[0]) / max(self.axis.size - 1, 1) or 1.0
        return _unit_weights(choice) / spacing

    def weights(self, choice: Choice, flat: np.ndarray) -> np.ndarray:
        """Weights (k, count) at flat nodes, all of which the stencil fits."""
        if self.is_uniform:
            return np.broadcast_to(self._uniform(choice), (flat.size, choice.count))
        places, which = np.unique(self.position(flat), return_inverse=True)
        return choice.weights(self.axis, places)[which]

    def _weights_at(self, choice: Choice, places: np.ndarray) -> np.ndarray:
        """Weights (k, count) at places of the axis; (1, count) for all of them on an even axis."""
        return self._uniform(choice)[None, :] if self.is_uniform else choice.weights(self.axis, places)

    def position(self, flat: np.ndarray) -> np.ndarray:
        return flat % self.nx if self.is_x else flat // self.nx

    def members(self, flat: np.ndarray, choice: Choice) -> tuple[np.ndarray, np.ndarray]:
        """Which of the nodes the stencil fits, bool (k,), and its flat nodes for those, (fitting, count)."""
        position = self.position(flat)
        inside = (position + choice.first >= 0) & (position + choice.last < self.axis.size)
        steps = np.arange(choice.first, choice.last + 1) * self.stride
        return inside, flat[inside][:, None] + steps


@cache
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
    """Sum of shifted arrays, each times its weights, which broadcast to it."""
    np.multiply(shifted[0], weights[0], out=out)
    spare = np.empty_like(out)
    for part, weight in zip(shifted[1:], weights[1:], strict=True):
        np.multiply(part, weight, out=spare)
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
