"""Smoothing that never makes a value where there is none, kept as the linear map that it is."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse as sp

from fieldview.compute.errors import InputError
from fieldview.compute.grid import Grid
from fieldview.compute.linear import LinearMap, SparseMap

METHODS = ("gaussian", "savitzky_golay", "penalised")

_GAUSSIAN_REACH = 4.0
"""Standard deviations after which the Gaussian's weights are cut off."""


@dataclass(frozen=True, eq=False)
class GaussianMap:
    """Normalised convolution: Gaussian weights over valid nodes, divided by their sum.

    Kept as the two filters that it is, since its matrix would be large; `rows` makes the part asked for.

    Attributes
    ----------
    valid : bool ndarray (ny, nx)
    width : float
        Standard deviation. [nodes]
    exact, note
        As of every map.
    """

    valid: np.ndarray
    width: float
    exact: bool = True
    note: str = ""

    def forward(self, values):
        """(n,) or (n, k) to the same shape."""
        return self._filtered(values, before=self.valid, after=self._per_sum)

    def transpose(self, weights):
        """(n,) or (n, k) to the same shape."""
        return self._filtered(weights, before=self._per_sum, after=self.valid)

    def rows(self, nodes) -> sp.csr_array:
        """Rows of the matrix at flat nodes: (len(nodes), n)."""
        nodes = np.asarray(nodes)
        (ny, nx), reach = self.valid.shape, self._reach
        iy, ix = np.divmod(nodes, nx)
        steps = np.arange(-reach, reach + 1)
        jy, jx = iy[:, None, None] + steps[:, None], ix[:, None, None] + steps
        inside = (jy >= 0) & (jy < ny) & (jx >= 0) & (jx < nx) & self.valid[iy, ix][:, None, None]
        row, *place = np.nonzero(inside)
        members = jy[row, place[0], 0] * nx + jx[row, 0, place[1]]
        there = self.valid.ravel()[members]
        row, members, place = row[there], members[there], [part[there] for part in place]
        weights = self._weights[place[0]] * self._weights[place[1]] * self._per_sum.ravel()[nodes[row]]
        return sp.csr_array((weights, (row, members)), shape=(nodes.size, self.valid.size))

    @property
    def _reach(self) -> int:
        return int(np.ceil(_GAUSSIAN_REACH * self.width))

    @cached_property
    def _weights(self) -> np.ndarray:
        return np.exp(-0.5 * (np.arange(-self._reach, self._reach + 1) / self.width) ** 2)

    @cached_property
    def _per_sum(self) -> np.ndarray:
        """One over the sum of the weights at every valid node, 0 elsewhere."""
        total = self._convolved(self.valid[:, :, None].astype(float))[:, :, 0]
        return np.where(self.valid, 1 / np.maximum(total, 1e-300), 0.0)

    def _filtered(self, values, *, before: np.ndarray, after: np.ndarray) -> np.ndarray:
        values = np.asarray(values, float)
        layers = values.reshape(*self.valid.shape, -1) * before[:, :, None]
        return (self._convolved(layers) * after[:, :, None]).reshape(values.shape)

    def _convolved(self, layers: np.ndarray) -> np.ndarray:
        from scipy.ndimage import correlate1d

        for axis in (0, 1):
            layers = correlate1d(layers, self._weights, axis=axis, mode="constant")
        return layers


def smoothing_map(
    grid: Grid,
    valid: np.ndarray,
    *,
    method: str = "gaussian",
    width: float | None = None,
    values: Mapping[str, np.ndarray] | None = None,
) -> LinearMap:
    """The map that smooths the values of valid nodes.

    Parameters
    ----------
    grid : Grid
    valid : bool ndarray (ny, nx)
        Nodes with values; nothing is taken from or put at the others.
    method : str
        "gaussian": weights exp(-r^2 / 2 width^2) over valid nodes, divided by their sum (normalised
        convolution). "savitzky_golay": parabolas fitted by least squares over a window, along x and
        then along y. "penalised": see `penalised`.
    width : float, optional
        gaussian: standard deviation, 1 if left out; savitzky_golay: odd window, 5 if left out;
        penalised: wavelength that is halved, chosen by generalised cross-validation if left out. [nodes]
    values : mapping of component name to ndarray (ny, nx), optional
        Needed by the cross-validation of "penalised" alone.

    Returns
    -------
    LinearMap

    Raises
    ------
    InputError
        An unknown method or a width that does not fit it.

    Sources: Knutsson & Westin (1993) for the normalised convolution (from memory); Savitzky & Golay (1964)
    Anal. Chem. 36:1627-1639; Garcia (2010) Comput. Stat. Data Anal. 54:1167-1178.
    """
    if method not in METHODS:
        raise InputError(f'smoothing "{method}" is not known; the methods are: {", ".join(METHODS)}')
    if width is not None and not width > 0:
        raise InputError(f"the width of a smoothing is {width}; give a positive number")
    valid = np.asarray(valid, bool)
    if method == "penalised":
        from fieldview.compute.penalised import penalised_map

        return penalised_map(valid, width=width, values=values)
    if method == "gaussian":
        return GaussianMap(valid, 1.0 if width is None else float(width))
    return SparseMap(_savitzky_golay(grid, valid, 5 if width is None else width))


def _savitzky_golay(grid: Grid, valid: np.ndarray, width: float) -> sp.csr_array:
    window = round(width)
    if window != width or window < 3 or window % 2 == 0:
        raise InputError(f"the window of a Savitzky-Golay smoothing is {width}; give an odd number from 3 on")
    ny, nx = valid.shape
    along_x = _local_parabolas(grid.x, valid, window, starts=np.arange(ny) * nx, stride=1)
    along_y = _local_parabolas(grid.y, valid.T, window, starts=np.arange(nx), stride=nx)
    return sp.csr_array(along_y @ along_x)


def _local_parabolas(
    axis: np.ndarray, lines: np.ndarray, window: int, *, starts: np.ndarray, stride: int
) -> sp.csr_array:
    """Parabolas along one direction, (n, n), fitted to the valid nodes of a window, taken at the node itself.

    The window is shifted inward at the ends of the axis. A node with fewer than three valid nodes in its
    window keeps its value.

    Parameters
    ----------
    axis : ndarray (size,)
    lines : bool ndarray (count, size)
        Valid nodes, line by line.
    window : int
    starts : int ndarray (count,)
        Flat number of each line's first node.
    stride : int
        Flat distance of neighbours along the line.
    """
    size = axis.size
    window = min(window, size)
    rows, columns, weights = [], [], []
    for place in range(size):
        first = min(max(place - window // 2, 0), size - window)
        there = lines[:, first : first + window]
        for pattern in np.unique(there[lines[:, place]], axis=0):
            base = starts[lines[:, place] & (there == pattern).all(axis=1)]
            taken = first + np.flatnonzero(pattern)
            rows.append(np.repeat(base + place * stride, taken.size))
            columns.append((base[:, None] + taken * stride).ravel())
            weights.append(np.tile(_fit_weights(axis[taken] - axis[place]), base.size))
    if not rows:
        return sp.csr_array((lines.size, lines.size))
    entries = (np.concatenate(weights), (np.concatenate(rows), np.concatenate(columns)))
    return sp.csr_array(entries, shape=(lines.size, lines.size))


def _fit_weights(arms: np.ndarray) -> np.ndarray:
    """Weights (k,) of the value at 0 of the parabola that fits points at arms (0 is among them)."""
    if arms.size < 3:
        return (arms == 0).astype(float)
    reach = np.abs(arms).max()
    return np.linalg.pinv((arms / reach)[:, None] ** np.arange(3))[0]
