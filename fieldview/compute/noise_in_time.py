"""Noise and standstill in time: what neighbouring frames say of each other at every node."""

from __future__ import annotations

from collections import deque
from collections.abc import Mapping, Sequence
from math import comb

import numpy as np

from fieldview.compute.medians import MAD_TO_SIGMA

_ORDERS = (2, 3, 4)
_FEWEST_NODES = 20
_FLOW_LEFT = 1.15
"""Ratio above which differences in time hold more than noise: of the last two orders to each other, or of the
last to its own differences between nodes, which a change of the flow over many nodes drops out of."""


class NoiseInTime:
    """Noise level per component from high-order differences in time, and vectors that do not change.

    Errors of successive frames are independent while a flow resolved in time is smooth: its differences of
    high order leave the errors. Of the orders two to four the smallest estimate is taken, since what is left
    of the flow only adds; a flow that is not resolved in time makes it an upper bound.

    Parameters
    ----------
    names : sequence of str
    shape : (int, int)
    correlation : (float, float)
        Nodes along x and y over which errors are correlated.
    """

    def __init__(
        self, names: Sequence[str], shape: tuple[int, int], *, correlation: tuple[float, float] = (1.0, 1.0)
    ):
        self.names = tuple(names)
        # along the longer axis, between nodes whose errors are independent
        self._along = int(shape[1] >= shape[0])
        self._apart = max(1, int(np.ceil(correlation[0] if self._along else correlation[1])))
        self._local: dict[str, list[float]] = {name: [] for name in self.names}
        self._past: deque = deque(maxlen=max(_ORDERS) + 1)
        self._levels: dict[tuple[str, int], list[float]] = {
            (name, order): [] for name in self.names for order in _ORDERS
        }
        self._repeats, self._compared = np.zeros(shape, np.int64), np.zeros(shape, np.int64)

    def add(self, parts: Mapping[str, np.ndarray]) -> float | None:
        """The next frame, component name to ndarray (ny, nx), NaN where not measured.

        Returns
        -------
        float or None
            Share of the vectors measured in this frame and the last that are the same to the last digit; None
            where no two can be compared.
        """
        values = [np.asarray(parts[name], float) for name in self.names]
        self._past.append(values)
        for order in _ORDERS:
            if len(self._past) > order:
                self._difference(order)
        if len(self._past) < 2:
            return None
        return self._compare(self._past[-2], values)

    def skip(self) -> None:
        """A frame that could not be read: nothing is compared across it."""
        self._past.clear()

    def level(self, name: str) -> float | None:
        """Noise estimate of a component; None if there are too few frames or nodes. [velocity]"""
        found = [np.median(self._levels[name, order]) for order in _ORDERS if self._levels[name, order]]
        return float(min(found)) if found else None

    def resolved(self, name: str) -> bool:
        """Whether the estimate is of noise alone, not an upper bound."""
        third, fourth = (self._levels[name, order] for order in _ORDERS[-2:])
        if not fourth or not self._local[name]:
            return False
        last = np.median(fourth)
        return bool(np.median(third) < _FLOW_LEFT * last and last < _FLOW_LEFT * np.median(self._local[name]))

    @property
    def repeats(self) -> np.ndarray:
        """Share of the comparisons with the frame before in which a node did not change (ny, nx)."""
        return np.where(self._compared > 0, self._repeats / np.maximum(self._compared, 1), np.nan)

    def _difference(self, order: int) -> None:
        weights = [(-1) ** k * comb(order, k) for k in range(order + 1)]
        gain = np.sqrt(comb(2 * order, order))
        frames = list(self._past)[-order - 1 :]
        for place, name in enumerate(self.names):
            total = sum(weight * frame[place] for weight, frame in zip(weights, frames, strict=True))
            self._levels[name, order] += _level(total, gain)
            if order == _ORDERS[-1]:
                moved = np.moveaxis(total, self._along, 0)
                local = moved[self._apart :] - moved[: -self._apart]
                self._local[name] += _level(local, np.sqrt(2) * gain)

    def _compare(self, before, now) -> float | None:
        pairs = list(zip(before, now, strict=True))
        both = np.logical_and.reduce([np.isfinite(old) & np.isfinite(new) for old, new in pairs])
        same = both & np.logical_and.reduce([old == new for old, new in pairs])
        self._compared += both
        self._repeats += same
        return float(same.sum() / both.sum()) if both.any() else None


def _level(values: np.ndarray, gain: float) -> list[float]:
    """Noise behind differences with this gain; nothing where they are too few."""
    sizes = np.abs(values[np.isfinite(values)])
    return [MAD_TO_SIGMA * float(np.median(sizes)) / gain] if sizes.size >= _FEWEST_NODES else []
