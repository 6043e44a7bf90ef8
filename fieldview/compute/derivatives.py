"""Derivatives along the lattice's axes, as arrays and as the sparse rows of the very same operator.

A value is NaN where it is not valid. Near edges and gaps a node takes a one-sided stencil of the same
order if one is open to it, else one of lower order; where none is, its derivative is NaN. Nodes so
treated are marked.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from fieldview.compute.grid import Grid
from fieldview.compute.stencils import SCHEMES, Choice, Scheme, across_weights, scheme_named

__all__ = ["SCHEMES", "Gradient", "derivative", "derivative_rows", "gradient", "noise_gain"]


@dataclass(frozen=True, eq=False)
class Gradient:
    """Derivatives along the lattice's axes.

    Attributes
    ----------
    d_dx, d_dy : ndarray (ny, nx)
        NaN where there is none. [value/length]
    fallback : bool ndarray (ny, nx)
        Nodes where either of them is one-sided or of lower order.
    """

    d_dx: np.ndarray
    d_dy: np.ndarray
    fallback: np.ndarray


def gradient(values: np.ndarray, grid: Grid, *, scheme: str = "central") -> Gradient:
    """Both derivatives of node values (ny, nx), NaN where not valid."""
    d_dx, one_sided_x = derivative(values, grid, "x", scheme=scheme)
    d_dy, one_sided_y = derivative(values, grid, "y", scheme=scheme)
    fallback = np.zeros(d_dx.size, bool)
    fallback[one_sided_x] = True
    fallback[one_sided_y] = True
    return Gradient(d_dx, d_dy, fallback.reshape(d_dx.shape))


def derivative(
    values: np.ndarray, grid: Grid, along: str, *, scheme: str = "central"
) -> tuple[np.ndarray, np.ndarray]:
    """Derivative along "x" or "y" of the lattice.

    Parameters
    ----------
    values : ndarray (ny, nx)
        NaN where not valid.
    grid : Grid
    along : "x" or "y"
    scheme : str
        One of `SCHEMES`.

    Returns
    -------
    slope : ndarray (ny, nx)
        NaN where no stencil is open. [value/length]
    fallback : int ndarray (k,)
        Flat numbers of the nodes that took another stencil than the scheme's own.
    """
    rule = scheme_named(scheme)
    values = np.asarray(values, float)
    line = _Line(grid, along)
    slope = line.first_choice(values, rule)
    absent = np.isnan(slope)
    invalid = np.isnan(values)
    slope[invalid] = np.nan
    absent &= ~invalid
    needy = np.flatnonzero(absent)
    taken = []
    for choice in rule.choices if rule.across else rule.choices[1:]:
        if needy.size == 0:
            break
        inside, members = line.members(needy, choice)
        found = np.full(needy.size, np.nan)
        weights = line.weights(choice, needy[inside])
        found[inside] = (weights * values.ravel()[members]).sum(axis=1)
        done = ~np.isnan(found)
        slope.ravel()[needy[done]] = found[done]
        taken.append(needy[done])
        needy = needy[~done]
    return slope, np.concatenate(taken) if taken else needy[:0]


def derivative_rows(
    grid: Grid, valid: np.ndarray, *, scheme: str = "central", nodes: np.ndarray | None = None
) -> tuple[sp.csr_array, sp.csr_array]:
    """The rows of both derivatives' matrices, exactly as `gradient` applies them.

    Parameters
    ----------
    grid : Grid
    valid : bool ndarray (ny, nx)
    scheme : str
    nodes : int ndarray (k,), optional
        Flat node numbers of the rows wanted; all of them if left out.

    Returns
    -------
    d_dx, d_dy : csr_array (k, ny * nx)
        Rows of nodes without a derivative are empty. [1/length]
    """
    rule = scheme_named(scheme)
    nodes = np.arange(valid.size) if nodes is None else np.asarray(nodes, np.intp)
    return tuple(_rows(_Line(grid, along), rule, valid.ravel(), nodes) for along in ("x", "y"))


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
    grid = Grid(np.arange(9.0), np.arange(9.0))
    rows = derivative_rows(grid, np.ones((9, 9), bool), scheme=scheme, nodes=np.array([40]))
    axes_taken = {"vorticity": (0, 1), "divergence": (0, 1), "d_dx": (0,), "d_dy": (1,)}[quantity]
    from fieldview.compute.covariance import functional_variance

    sigma = np.ones((9, 9))
    variances = [
        functional_variance(rows[axis].toarray().reshape(9, 9), sigma, correlation) for axis in axes_taken
    ]
    return float(np.sqrt(sum(variances)))


class _Line:
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


def _rows(line: _Line, rule: Scheme, valid: np.ndarray, nodes: np.ndarray) -> sp.csr_array:
    rows, columns, weights = [], [], []

    def add(numbers, members, values):
        rows.append(np.repeat(numbers, members.shape[1]))
        columns.append(members.ravel())
        weights.append(np.asarray(values).ravel())

    open_ = np.flatnonzero(valid[nodes])
    if rule.across:
        open_ = _add_across(line, rule, valid, nodes, open_, add)
    for choice in rule.choices:
        inside, members = line.members(nodes[open_], choice)
        fits = valid[members].all(axis=1)
        done = np.zeros(open_.size, bool)
        done[np.flatnonzero(inside)[fits]] = True
        add(open_[done], members[fits], line.weights(choice, nodes[open_[done]]))
        open_ = open_[~done]
    entries = (np.concatenate(weights), (np.concatenate(rows), np.concatenate(columns)))
    return sp.csr_array(entries, shape=(nodes.size, valid.size))


def _add_across(line: _Line, rule: Scheme, valid, nodes, open_, add) -> np.ndarray:
    """Adds the rows whose three lines are all valid; returns the row numbers that are left."""
    choice = rule.choices[0]
    lines = line.nx if line.is_x else 1  # flat step from one line to the next
    flat = nodes[open_]
    lane = flat // line.nx if line.is_x else flat % line.nx
    inner = (lane > 0) & (lane < line.cross.size - 1)
    inside, _ = line.members(flat, choice)
    able = np.flatnonzero(inner & inside)
    if able.size == 0:
        return open_
    weights = across_weights(line.cross)
    _, members = line.members(flat[able], choice)
    slopes = line.weights(choice, flat[able])
    boxes = np.concatenate([members + step * lines for step in (-1, 0, 1)], axis=1)
    values = np.concatenate([slopes * weights[lane[able] - 1, k, None] for k in range(3)], axis=1)
    whole = valid[boxes].all(axis=1)
    add(open_[able[whole]], boxes[whole], values[whole])
    return np.delete(open_, able[whole])
