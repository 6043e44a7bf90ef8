"""Harmonic and biharmonic interpolation across gaps: the shape of a membrane or a plate held by the rim.

Every node of a gap gets one linear equation between lattice nodes. Solved together they give the weights
of the valid nodes around. An equation is only written where all its nodes are there; near edges and
masks it is replaced by one that needs fewer, and where none is left the node stays missing.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp

from fieldview.compute.errors import InputError
from fieldview.compute.grid import Grid

_LARGEST_DENSE = 60
"""Nodes of a gap up to which its equations are inverted together with those of all gaps of its size."""

_MOST_WEIGHTS = 20_000_000
"""Weights that one gap may need; beyond that it is refused rather than filling the memory."""


def plate_weights(grid: Grid, valid: np.ndarray, open_: np.ndarray, *, biharmonic: bool) -> sp.csr_array:
    """Weights (n, n) of the valid nodes at the nodes to be filled; other rows are empty.

    Harmonic: the three-point second differences along x and y, each where both neighbours are there,
    sum to zero. Every filled value is then a mean of those around it, with positive weights.
    Biharmonic: the 13-point equation where it fits; else fourth differences along the lines that have
    five nodes about this one (cubic along an edge); else the harmonic one.
    """
    unknown = open_.copy()
    while True:
        equations = _equations(grid, valid | unknown, unknown, biharmonic)
        bare = unknown.ravel() & (np.diff(equations.indptr) == 0)
        if not bare.any():
            break
        unknown &= ~bare.reshape(unknown.shape)
    return _solved(equations, np.flatnonzero(unknown))


def _equations(grid, there, unknown, biharmonic) -> sp.csr_array:
    """One row (of n) for every unknown node that some equation fits; the coefficients sum to zero."""
    second = [_differences(grid, there, axis, 3) for axis in (0, 1)]
    rows = second[0] + second[1]
    if biharmonic:
        fourth = [_differences(grid, there, axis, 5) for axis in (0, 1)]
        # d4/dx4 + 2 d2/dx2 d2/dy2 + d4/dy4; the mixed one needs the 3 x 3 nodes, checked by both orders
        whole = _box_is_there(there)
        mixed = sp.diags_array(whole.ravel().astype(float)) @ (second[0] @ second[1])
        full = whole.ravel() & (np.diff(fourth[0].indptr) > 0) & (np.diff(fourth[1].indptr) > 0)
        lines = (np.diff(fourth[0].indptr) > 0) | (np.diff(fourth[1].indptr) > 0)
        rows = _first_of(
            (full, fourth[0] + 2 * mixed + fourth[1]), (lines, fourth[0] + fourth[1]), (~lines, rows)
        )
    return sp.csr_array(sp.diags_array(unknown.ravel().astype(float)) @ rows)


def _first_of(*candidates) -> sp.csr_array:
    """Rows of the first matrix whose mark is set; the marks (n,) come in order of preference."""
    taken = np.zeros(candidates[0][0].size, bool)
    total = None
    for mark, matrix in candidates:
        part = sp.diags_array((mark & ~taken).astype(float)) @ matrix
        total = part if total is None else total + part
        taken |= mark
    return _without_zeros(total)


def _differences(grid: Grid, there: np.ndarray, axis: int, count: int) -> sp.csr_array:
    """Derivatives of order ``count`` - 1 by centred stencils of ``count`` nodes, rows where all are there.

    Along axis 0 (y) or 1 (x), from the interpolating polynomial: (count - 1)! times the divided difference.
    """
    nx = there.shape[1]
    half = count // 2
    positions = grid.y if axis == 0 else grid.x
    size, stride = positions.size, nx if axis == 0 else 1
    if size < count:
        return sp.csr_array((there.size, there.size))
    lines = there if axis == 1 else there.T
    whole = np.logical_and.reduce([lines[:, k : size - count + 1 + k] for k in range(count)])
    lane, place = np.nonzero(whole)
    place += half
    centre = lane * nx + place if axis == 1 else place * nx + lane
    offsets = np.arange(-half, half + 1)
    weights = _divided_difference(positions / np.nanmin(grid.spacing), count)[place - half]
    entries = (weights.ravel(), (np.repeat(centre, count), (centre[:, None] + offsets * stride).ravel()))
    return sp.csr_array(entries, shape=(there.size, there.size))


def _divided_difference(positions: np.ndarray, count: int) -> np.ndarray:
    """Weights (size - count + 1, count) of the derivative of order count - 1."""
    windows = np.lib.stride_tricks.sliding_window_view(positions, count)
    gaps = windows[:, :, None] - windows[:, None, :]
    gaps[:, np.arange(count), np.arange(count)] = 1.0
    factorial = float(np.prod(np.arange(1, count)))
    return factorial / gaps.prod(axis=2)


def _box_is_there(there: np.ndarray) -> np.ndarray:
    """Nodes whose 3 x 3 surroundings are all there."""
    padded = np.pad(there, 1)
    ny, nx = there.shape
    return np.logical_and.reduce([padded[j : j + ny, i : i + nx] for j in range(3) for i in range(3)])


def _solved(equations: sp.csr_array, unknown: np.ndarray) -> sp.csr_array:
    """Rows of weights at the unknown nodes (flat numbers) from equations whose sum is zero."""
    size = equations.shape[0]
    if unknown.size == 0:
        return sp.csr_array((size, size))
    own = sp.csr_array(equations[unknown])
    scale = sp.diags_array(1 / np.abs(own).sum(axis=1))
    own = sp.csr_array(scale @ own)
    among = sp.csr_array(own[:, unknown])
    known = own.tocsc()
    is_known = np.ones(size, bool)
    is_known[unknown] = False
    known = sp.csr_array(known @ sp.diags_array(is_known.astype(float)))
    known = _without_zeros(known)
    count, group = sp.csgraph.connected_components(among, directed=False)
    weights = _small_inverses(among, group, count) @ known
    parts = [weights] + [
        _large_solution(among, known, np.flatnonzero(group == number))
        for number in np.flatnonzero(np.bincount(group, minlength=count) > _LARGEST_DENSE)
    ]
    solution = sp.coo_array(-sum(parts))
    rows = unknown[solution.coords[0]]
    keep = np.abs(solution.data) > 1e-14
    entries = (solution.data[keep], (rows[keep], solution.coords[1][keep]))
    return sp.csr_array(entries, shape=(size, size))


def _small_inverses(among: sp.csr_array, group: np.ndarray, count: int) -> sp.csr_array:
    """Inverse of the block-diagonal matrix of all small gaps, blocks of one size inverted together."""
    size_of = np.bincount(group, minlength=count)
    order = np.argsort(group, kind="stable")
    start = np.concatenate([[0], np.cumsum(size_of)])
    place = np.empty(group.size, int)
    place[order] = np.arange(group.size) - start[group[order]]
    entries = sp.coo_array(among)
    rows, columns, values = [], [], []
    for size in np.unique(size_of[size_of <= _LARGEST_DENSE]):
        members = np.flatnonzero(size_of == size)
        number = np.full(count, -1)
        number[members] = np.arange(members.size)
        mine = size_of[group[entries.coords[0]]] == size
        i, j = entries.coords[0][mine], entries.coords[1][mine]
        blocks = np.zeros((members.size, size, size))
        blocks[number[group[i]], place[i], place[j]] = entries.data[mine]
        nodes = order[start[members][:, None] + np.arange(size)]
        rows.append(np.repeat(nodes, size, axis=1).ravel())
        columns.append(np.tile(nodes, (1, size)).ravel())
        values.append(np.linalg.inv(blocks).ravel())
    if not rows:
        return sp.csr_array(among.shape)
    entries = (np.concatenate(values), (np.concatenate(rows), np.concatenate(columns)))
    return sp.csr_array(entries, shape=among.shape)


def _large_solution(among: sp.csr_array, known: sp.csr_array, members: np.ndarray) -> sp.coo_array:
    """Weights of one large gap, in the rows of its members."""
    from scipy.sparse.linalg import splu

    sides = sp.csc_array(known[members])
    columns = np.flatnonzero(np.diff(sides.indptr))
    if columns.size * members.size > _MOST_WEIGHTS:
        raise InputError(
            f"a gap of {members.size} nodes is too large for this way of filling; "
            "give max_gap to leave it open"
        )
    block = sp.csc_array(among[members][:, members])
    solved = splu(block).solve(sides[:, columns].toarray())
    rows = np.repeat(members, columns.size)
    entries = (solved.ravel(), (rows, np.tile(columns, members.size)))
    return sp.coo_array(entries, shape=known.shape)


def _without_zeros(matrix) -> sp.csr_array:
    matrix = sp.csr_array(matrix)
    matrix.eliminate_zeros()
    return matrix
