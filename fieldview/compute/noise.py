"""Noise level of a run from the roughness of its own frames."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.medians import MAD_TO_SIGMA
from fieldview.compute.validation import median_test

_ORDERS = ((4, 4), (3, 3), (2, 2), (6, 0), (0, 6), (4, 0), (0, 4))
"""Orders of the differences along x and y. Each takes the noise whole and leaves little of the flow."""

_FEWEST_SAMPLES = 50
"""Differences below which the median of their size says too little (its own error is then 13 %)."""

_DOUBT = 10.0
"""Relative doubt about an estimate times the root of its number of differences, which overlap; found by
trial on vortices with correlated noise, where the estimates then scatter by 3 % without bias."""

_OUTLIER_THRESHOLD = 4.0
"""Normalised median residual of vectors left out; normal noise exceeds it once in 10^8 vectors or so."""


def estimate_sigma(fields: Iterable[Field], *, correlation: tuple[float, float]) -> dict[str, float]:
    """Standard deviation of the random errors of each component, from measured vectors alone.

    High-order differences between neighbours leave the errors and hardly any of a flow that is smooth over
    the measuring window. The median of their size, divided by the gain of the difference under the stated
    correlation, is the estimate; of several differences the smallest is taken, since what is left of the
    flow only adds. Differences reach over half a correlation length, not less, so that the shape of the
    correlation at short distances matters little. Outliers are left out by a median test first.

    Parameters
    ----------
    fields : iterable of Field
        Frames of one run on one grid.
    correlation : (float, float)
        Nodes along x and y over which errors are correlated.

    Returns
    -------
    dict of component name to float
        [velocity]

    Raises
    ------
    InputError
        There are too few neighbouring vectors to tell.
    """
    frames = [_measured(field) for field in fields]
    names = [name for name in ("u", "v", "w") if any(name in frame for frame in frames)]
    rough = {name: _level([frame[name] for frame in frames], correlation) for name in names}
    cleaned = [_without_outliers(frame, rough) for frame in frames]
    levels = {name: _level([frame[name] for frame in cleaned], correlation) for name in names}
    unknown = [name for name, level in levels.items() if level is None]
    if unknown or not names:
        raise InputError(
            f"the noise of {unknown[0] if unknown else 'the run'} cannot be estimated: there are too few "
            "neighbouring measured vectors; state sigma in the error model"
        )
    return levels


def _measured(field: Field) -> dict[str, np.ndarray]:
    there = field.status == Status.MEASURED
    return {name: np.where(there, part, np.nan) for name, part in field.components.items()}


def _without_outliers(parts: dict[str, np.ndarray], level: dict[str, float | None]) -> dict[str, np.ndarray]:
    floor = {name: level[name] or 0.0 for name in parts}
    if min(floor.values()) == 0.0:
        return parts
    rejected = median_test(**parts, threshold=_OUTLIER_THRESHOLD, floor=floor, passes=2).rejected
    return {name: np.where(rejected, np.nan, part) for name, part in parts.items()}


def _level(frames: Sequence[np.ndarray], correlation: tuple[float, float]) -> float | None:
    """Smallest of the estimates that enough differences stand behind."""
    steps = tuple(max(1, int(nodes // 2)) for nodes in correlation)
    estimates = []
    for orders in _ORDERS:
        sizes = [np.abs(_difference(frame, orders, steps)).ravel() for frame in frames]
        sizes = np.concatenate([size[np.isfinite(size)] for size in sizes])
        if sizes.size >= _FEWEST_SAMPLES:
            gain = np.prod([_gain(*how) for how in zip(orders, steps, correlation, strict=True)])
            estimate = MAD_TO_SIGMA * float(np.median(sizes)) / gain
            # ranked by an upper bound, so that few samples are not taken for little noise
            estimates.append((estimate * (1 + _DOUBT / np.sqrt(sizes.size)), estimate))
    return min(estimates)[1] if estimates else None


def _difference(values: np.ndarray, orders: tuple[int, int], steps: tuple[int, int]) -> np.ndarray:
    """Differences of these orders along x and y between nodes these steps apart."""
    for _ in range(orders[0]):
        values = values[:, steps[0] :] - values[:, : -steps[0]]
    for _ in range(orders[1]):
        values = values[steps[1] :] - values[: -steps[1]]
    return values


def _gain(order: int, step: int, nodes: float) -> float:
    """Standard deviation of a difference for errors of standard deviation 1, correlated over ``nodes``."""
    weights = np.array([1.0])
    for _ in range(order):
        weights = np.convolve(weights, [1.0, -1.0])
    place = step * np.arange(order + 1)
    correlation = np.maximum(0.0, 1 - np.abs(place[:, None] - place) / max(nodes, 1.0))
    return float(np.sqrt(weights @ correlation @ weights))
