"""Gaps of a lattice: connected sets of nodes to be filled, and how wide they are."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True, eq=False)
class Gaps:
    """The gaps of one frame.

    A gap is a set of wanted nodes connected along rows and columns. Its width is the side of the largest
    square of nodes that fits into it: a scratch one node wide is a gap of width 1 however long it is.

    Attributes
    ----------
    label : int ndarray (ny, nx)
        Number of the gap from 1 on, 0 outside.
    width : int ndarray (count + 1,)
        Width of each gap; entry 0 is 0. [nodes]
    """

    label: np.ndarray
    width: np.ndarray


def find_gaps(wanted: np.ndarray) -> Gaps:
    """Gaps of the wanted nodes, bool ndarray (ny, nx)."""
    from scipy import ndimage

    label, count = ndimage.label(wanted)
    width = np.zeros(count + 1, int)
    # corners of squares of side s: nodes that stay when the set is cut back s - 1 times
    corners, side = wanted, 1
    while corners.any():
        width[np.unique(label[corners])] = side
        cut = np.zeros_like(corners)
        cut[:-1, :-1] = corners[:-1, :-1] & corners[1:, :-1] & corners[:-1, 1:] & corners[1:, 1:]
        corners, side = cut, side + 1
    width[0] = 0
    return Gaps(label, width)
