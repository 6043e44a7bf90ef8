"""Derivatives along the lattice's axes, as arrays and as the sparse rows of the very same operator.

A value is NaN where it is not valid. Near edges and gaps a node takes a one-sided stencil of the same
order if one is open to it, else one of lower order; where none is, its derivative is NaN. Nodes so
treated are marked.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from fieldview.compute.grid import Grid
from fieldview.compute.lines import Line
from fieldview.compute.stencil_covariance import noise_gain
from fieldview.compute.stencils import SCHEMES, Scheme, across_weights, scheme_named

if TYPE_CHECKING:
    import scipy.sparse as sp

__all__ = ["SCHEMES", "Gradient", "combination", "derivative", "derivative_rows", "gradient", "noise_gain"]

_BLOCK_NODES = 40_000
"""Nodes worked on at a time, so that every pass but the first finds them in the cache."""


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
    return combination([(1.0, values, along)], grid, scheme=scheme)


def combination(
    terms: Sequence[tuple[float, np.ndarray, str]], grid: Grid, *, scheme: str = "central"
) -> tuple[np.ndarray, np.ndarray]:
    """Sum of factors times derivatives, such as the vorticity, in one go through the memory.

    Parameters
    ----------
    terms : sequence of (float, ndarray (ny, nx), "x" or "y")
        Factor, values and direction of each derivative.
    grid, scheme
        As of `derivative`, and so is what is returned.
    """
    rule = scheme_named(scheme)
    terms = [(factor, np.asarray(values, float), Line(grid, along, rule)) for factor, values, along in terms]
    if not rule.across:
        total = _without_gaps(terms, grid.shape)
        if total is not None:
            return total, np.concatenate([line.end_nodes for _, _, line in terms])
    total, fallback = 0.0, []
    for factor, values, line in terms:
        slope, taken = _with_gaps(values, line)
        total = total + factor * slope
        fallback.append(taken)
    return total, np.concatenate(fallback)


def _without_gaps(terms, shape: tuple[int, int]) -> np.ndarray | None:
    """The sum where no value is missing, block by block of rows in the cache; None where one is."""
    total = np.empty(shape)
    rows = max(1, _BLOCK_NODES // shape[1])
    spare = np.empty((rows, shape[1])) if len(terms) > 1 else None
    for top in range(0, shape[0], rows):
        bottom = min(top + rows, shape[0])
        block = total[top:bottom]
        for number, (factor, values, line) in enumerate(terms):
            part = block if number == 0 else spare[: bottom - top]
            line.apply(values, top, bottom, part)
            if number == 0 and factor != 1:
                part *= factor
            elif number > 0:
                _add(block, factor, part)
        # a NaN anywhere makes the sum NaN
        if not np.isfinite(block.sum()):
            return None
    return total


def _add(total: np.ndarray, factor: float, part: np.ndarray) -> None:
    if factor == -1:
        total -= part
        return
    if factor != 1:
        part *= factor
    total += part


def _with_gaps(values: np.ndarray, line: Line) -> tuple[np.ndarray, np.ndarray]:
    """One derivative where values are missing, and the nodes that took another stencil."""
    rule = line.rule
    slope = np.empty(values.shape)
    line.apply(values, 0, values.shape[0], slope)
    invalid = np.isnan(values)
    slope[invalid] = np.nan
    ends = line.end_nodes[np.isfinite(slope.ravel()[line.end_nodes])]
    choices = rule.choices[1:]
    if rule.across:
        slope, ends, choices = line.averaged_across(slope), ends[:0], rule.choices
    needy = np.flatnonzero(np.isnan(slope) & ~invalid)
    taken = [ends]
    for choice in choices:
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
    return slope, np.concatenate(taken)


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
    return tuple(_rows(Line(grid, along, rule), rule, valid.ravel(), nodes) for along in ("x", "y"))


def _rows(line: Line, rule: Scheme, valid: np.ndarray, nodes: np.ndarray) -> sp.csr_array:
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
        if open_.size == 0:
            break
    entries = (np.concatenate(weights), (np.concatenate(rows), np.concatenate(columns)))
    import scipy.sparse as sp

    return sp.csr_array(entries, shape=(nodes.size, valid.size))


def _add_across(line: Line, rule: Scheme, valid, nodes, open_, add) -> np.ndarray:
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
