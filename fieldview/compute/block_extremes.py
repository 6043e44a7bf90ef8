"""Least and greatest values of blocks of neighbouring nodes, for extremes over many nodes."""

from __future__ import annotations

import numpy as np

BLOCK = 32
"""Nodes of a block."""


class BlockExtremes:
    """Values of the nodes with the least and the greatest of every block of `BLOCK` of them.

    Parameters
    ----------
    values : ndarray (n,)
        What is NaN is left out of the extremes.

    Attributes
    ----------
    values : ndarray (n,)
    lowest, highest : ndarray (n / BLOCK, rounded up)
        NaN for blocks in which all is NaN.
    """

    def __init__(self, values: np.ndarray):
        self.values = values
        starts = np.arange(0, values.size, BLOCK)
        self.lowest = np.fmin.reduceat(values, starts)
        self.highest = np.fmax.reduceat(values, starts)
