"""The lattice seen along one of its two directions."""

from __future__ import annotations

from functools import cache, cached_property

import numpy as np

from fieldview.compute.grid import Grid
from fieldview.compute.stencils import Choice, Scheme, across_weights


class Line:
    """One of the lattice's two directions, "x" or "y": neighbours along it and a scheme's weights."""

    def __init__(self, grid: Grid, along: str, rule: Scheme):
        self.rule = rule
        self.ny, self.nx = grid.shape
        self.is_x = along == "x"
        self.axis, self.cross = (grid.x, grid.y) if self.is_x else (grid.y, grid.x)
        self.is_uniform = grid.is_uniform[0 if self.is_x else 1]
        self.stride = 1 if self.is_x else self.nx

    @cached_property
    def end_nodes(self) -> np.ndarray:
        """Flat nodes (k,) at the ends of the axis, where no centred stencil of the scheme fits."""
        starts = np.arange(self.ny) * self.nx if self.is_x else np.arange(self.nx)
        return (np.array(self._ends, np.intp)[:, None] * self.stride + starts).ravel()

    def apply(self, values: np.ndarray, top: int, bottom: int, out: np.ndarray) -> None:
        """The scheme's own stencil on the rows top ... bottom - 1 of values (ny, nx), into out (rows, nx).

        The ends of the axis get the first of the other stencils that fits, NaN where none does.
        """
        low, high = self._span(self.rule.choices[0])
        if high > low:
            (self._apply_even if self.is_uniform else self._apply_uneven)(values, top, bottom, out)
        for place, first, weights in self._end_stencils:
            members = slice(first, first + weights.size)
            if self.is_x:
                out[:, place] = (values[top:bottom, members] * weights).sum(axis=1)
            elif top <= place < bottom:
                out[place - top] = (values[members] * weights[:, None]).sum(axis=0)

    def averaged_across(self, slope: np.ndarray) -> np.ndarray:
        """Average of each line's slope with its two neighbours'; NaN at the first and last line and place."""
        averaged = np.full(slope.shape, np.nan)
        if self.cross.size > 2:
            lines, target = (slope, averaged) if self.is_x else (slope.T, averaged.T)
            inner = slice(1, self.axis.size - 1)
            weights = across_weights(self.cross)
            parts = [lines[k : self.cross.size - 2 + k, inner] * weights[:, k, None] for k in range(3)]
            target[1:-1, inner] = parts[0] + parts[1] + parts[2]
        return averaged

    @cached_property
    def _ends(self) -> list[int]:
        low, high = self._span(self.rule.choices[0])
        return [place for place in range(self.axis.size) if not low <= place < high]

    @cached_property
    def _end_stencils(self) -> list[tuple[int, int, np.ndarray]]:
        """For each place at the ends the first node of its stencil and the weights: NaN where none fits."""
        found = []
        for place in self._ends:
            for choice in self.rule.choices[1:]:
                first, stop = self._span(choice)
                if first <= place < stop:
                    weights = self._weights_at(choice, np.array([place]))[0]
                    found.append((place, place + choice.first, weights))
                    break
            else:
                found.append((place, place, np.array([np.nan])))
        return found

    def _span(self, choice: Choice) -> tuple[int, int]:
        """Places [low, high) of the axis that the stencil fits."""
        return -choice.first, self.axis.size - choice.last

    def _apply_even(self, values: np.ndarray, top: int, bottom: int, out: np.ndarray) -> None:
        """As one long line, which runs on from row to row, over what the ends overwrite later."""
        choice = self.rule.choices[0]
        flat, target = values.ravel(), out.ravel()
        start = max(top * self.nx, -choice.first * self.stride)
        stop = min(bottom * self.nx, flat.size - choice.last * self.stride)
        if stop > start:
            parts = [flat[start + k * self.stride : stop + k * self.stride] for k in choice.offsets]
            _antisymmetric_sum(parts, self._uniform(choice), target[start - top * self.nx :][: stop - start])

    def _apply_uneven(self, values: np.ndarray, top: int, bottom: int, out: np.ndarray) -> None:
        choice = self.rule.choices[0]
        low, high = self._span(choice)
        if self.is_x:
            weights = choice.weights(self.axis, np.arange(low, high)).T[:, None, :]
            parts = [values[top:bottom, low + k : high + k] for k in choice.offsets]
            _weighted_sum(parts, weights, out[:, low:high])
            return
        first, last = max(top, low), min(bottom, high)
        if last > first:
            weights = choice.weights(self.axis, np.arange(first, last)).T[:, :, None]
            parts = [values[first + k : last + k] for k in choice.offsets]
            _weighted_sum(parts, weights, out[first - top : last - top])

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
