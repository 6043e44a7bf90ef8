"""Filling of gaps, kept as the matrix that it is.

A node is filled from valid nodes (measured, or filled by an earlier step) only, never from nodes that
are filled with it. Nothing is extrapolated by "linear", "harmonic" and "biharmonic": nodes that
they cannot reach stay missing and are named.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from fieldview.compute.errors import InputError
from fieldview.compute.gaps import find_gaps
from fieldview.compute.grid import Grid
from fieldview.compute.linear import SparseMap

METHODS = ("linear", "harmonic", "biharmonic", "local_median")

MEDIAN_NOTE = (
    "filling by the local median is not linear: the uncertainty takes the neighbours that it chose as fixed"
)


@dataclass(frozen=True, eq=False)
class FillMap(SparseMap):
    """A filling: identity on valid nodes, weights of the sources on filled ones, zero elsewhere.

    Attributes
    ----------
    filled : bool ndarray (ny, nx)
    left : bool ndarray (ny, nx)
        Wanted nodes that were not filled: in too wide a gap, or out of the method's reach.
    method : str
    max_gap : int or None
        Widest gap that was to be filled, as `gaps.Gaps` defines the width. [nodes]
    """

    filled: np.ndarray | None = None
    left: np.ndarray | None = None
    method: str = "linear"
    max_gap: int | None = None


def fill_map(
    grid: Grid,
    valid: np.ndarray,
    wanted: np.ndarray,
    *,
    method: str = "linear",
    max_gap: int | None = None,
    values: Mapping[str, np.ndarray] | None = None,
) -> FillMap:
    """Values for the wanted nodes, made from the valid ones around each gap.

    Parameters
    ----------
    grid : Grid
    valid : bool ndarray (ny, nx)
        Nodes with values.
    wanted : bool ndarray (ny, nx)
        Nodes to be filled; nodes that are neither (masked ones) are walls.
    method : str
        "linear": Delaunay triangles over the valid nodes that touch the gap, within their hull; see
        `triangles`. "harmonic": Laplace's equation across the gap; reproduces linear fields.
        "biharmonic": the biharmonic equation; reproduces cubics. "local_median": median of the
        nearest valid nodes; for several components the vector median.
    max_gap : int, optional
        Gaps wider than this stay missing. [nodes]
    values : mapping of component name to ndarray (ny, nx), optional
        Needed by "local_median" alone.

    Returns
    -------
    FillMap

    Raises
    ------
    InputError
        An unknown method, or "local_median" without values.
    """
    if method not in METHODS:
        raise InputError(f'fill method "{method}" is not known; the methods are: {", ".join(METHODS)}')
    valid, wanted = np.asarray(valid, bool), np.asarray(wanted, bool)
    wanted = wanted & ~valid
    gaps = find_gaps(wanted)
    open_ = wanted if max_gap is None else wanted & (gaps.width[gaps.label] <= max_gap)
    label = np.where(open_, gaps.label, 0)
    if method == "linear":
        from fieldview.compute.triangles import linear_weights

        weights = linear_weights(grid, valid, label)
    elif method == "local_median":
        from fieldview.compute.medians import median_weights

        if not values:
            raise InputError("filling by the local median needs the components' values")
        weights = median_weights(list(values.values()), valid, open_)
    else:
        from fieldview.compute.plates import plate_weights

        weights = plate_weights(grid, valid, open_, biharmonic=method == "biharmonic")
    filled = np.zeros(valid.size, bool)
    filled[np.diff(weights.indptr) > 0] = True
    filled = filled.reshape(valid.shape)
    is_median = method == "local_median"
    return FillMap(
        matrix=sp.csr_array(weights + sp.diags_array(valid.ravel().astype(float), format="csr")),
        exact=not is_median,
        note=MEDIAN_NOTE if is_median else "",
        filled=filled,
        left=wanted & ~filled,
        method=method,
        max_gap=max_gap,
    )
