"""Tests that find wrong vectors.

Every test takes component arrays that are NaN wherever a vector must be neither judged nor used to judge
others, and answers with a `Verdict`. None of them changes a value.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.medians import MAD_TO_SIGMA, column_median
from fieldview.compute.neighbourhoods import neighbour_residual

FEWEST_NEIGHBOURS = 3
"""A vector with fewer neighbours than this is not judged by the median test."""

FEWEST_SAMPLES = 3
"""A vector with fewer samples in time than this, itself among them, is not judged by the time test."""


@dataclass(frozen=True, eq=False)
class Verdict:
    """What a test found.

    Attributes
    ----------
    rejected : bool ndarray (ny, nx)
    residual : ndarray (ny, nx) or None
        The figure held against the test's limit, the largest over the components; NaN where a node was
        not judged. None where the test has no such figure.
    not_judged : bool ndarray (ny, nx)
        Nodes with a value that could not be judged.
    """

    rejected: np.ndarray
    residual: np.ndarray | None
    not_judged: np.ndarray


def range_test(u=None, v=None, w=None, *, limits: Mapping[str, tuple[float | None, float | None]]) -> Verdict:
    """Vectors outside stated limits; the limits themselves are kept.

    Parameters
    ----------
    u, v, w : ndarray (ny, nx), optional
        Components, NaN where not to be judged. [velocity]
    limits : mapping
        Of "u", "v", "w" or "speed" to (lowest, highest), None for no limit. Speed is the length of the
        vector in all the components given. [velocity]

    Raises
    ------
    InputError
        A limit for a component that was not given, or limits in the wrong order.
    """
    parts = _given(u, v, w)
    rejected = np.zeros(_shape(parts), bool)
    for name, bounds in limits.items():
        if name == "speed":
            values = np.sqrt(sum(part**2 for part in parts.values()))
        elif name in parts:
            values = parts[name]
        else:
            raise InputError(f"limits are given for {name}, which is not there; remove them")
        rejected |= _outside(values, *bounds, name)
    return Verdict(rejected, None, np.zeros_like(rejected))


def quality_test(values, *, at_least: float | None = None, at_most: float | None = None) -> Verdict:
    """Vectors whose quality channel lies outside limits; the limits themselves are kept.

    Parameters
    ----------
    values : ndarray (ny, nx)
        The channel. Where it is NaN a vector is not judged.
    at_least, at_most : float, optional
        In the channel's own unit.
    """
    values = np.asarray(values, float)
    return Verdict(_outside(values, at_least, at_most, "the channel"), None, np.isnan(values))


def median_test(
    u=None, v=None, w=None, *, radius: int = 1, threshold: float = 2.0, floor, passes: int = 1
) -> Verdict:
    """Normalised median test: |U0 - Um| / (rm + floor) above ``threshold`` in any component.

    Um is the median of the neighbours and rm the median of their distances from it, the centre left out
    of both. Neighbours that are missing are left out; at an edge those that are there are used; with
    fewer than three a vector is not judged. A later pass repeats the test without what was rejected.

    Parameters
    ----------
    u, v, w : ndarray (ny, nx), optional
        Components, NaN where a vector is neither to be judged nor used. [velocity]
    radius : int
        Half-width of the square neighbourhood. [nodes]
    threshold : float
        Largest residual that is kept. [1]
    floor : float or mapping of component name to float
        Expected noise level. [velocity]
    passes : int

    Returns
    -------
    Verdict
        ``residual`` is that of the pass that rejected the vector, else of the last pass.

    Raises
    ------
    InputError
        A threshold, floor, radius or number of passes that makes no sense.

    Source: Westerweel & Scarano (2005) Exp. Fluids 39:1096-1100, eq. 2 and its extension to missing
    neighbours there.
    """
    parts = _given(u, v, w)
    shape = _shape(parts)
    floors = _floors(floor, parts)
    if not threshold > 0:
        raise InputError(f"threshold is {threshold}; give a positive number (2 is usual)")
    if radius < 1 or passes < 1:
        raise InputError(f"radius is {radius} and passes is {passes}; give whole numbers from 1 on")
    usable = np.isfinite(next(iter(parts.values())))
    for part in list(parts.values())[1:]:
        usable &= np.isfinite(part)
    rejected, residual = np.zeros(shape, bool), np.full(shape, np.nan)
    for _ in range(passes):
        latest, neighbours = neighbour_residual(list(parts.values()), usable, radius, list(floors.values()))
        not_judged = usable & (neighbours < FEWEST_NEIGHBOURS)
        np.copyto(residual, latest, where=usable)
        residual[not_judged] = np.nan
        worse = usable & (residual > threshold)
        if not worse.any():
            break
        rejected |= worse
        usable &= ~worse
    return Verdict(rejected, residual, not_judged)


def spread_test(u=None, v=None, w=None, *, limit: float) -> Verdict:
    """Vectors farther from the frame's median than ``limit`` x 1.4826 MAD in any component.

    Parameters
    ----------
    u, v, w : ndarray (ny, nx), optional
        Components, NaN where not to be judged. [velocity]
    limit : float
        [1]

    Source: common practice; 1.4826 makes the median absolute deviation of a normal distribution its
    standard deviation (1 / inverse normal distribution of 3/4).
    """
    parts = _given(u, v, w)
    _positive(limit, "limit")
    columns = {name: part.reshape(-1, 1, 1) for name, part in parts.items()}
    return _hampel(parts, columns, limit)


def time_test(parts: Mapping[str, np.ndarray], stacks: Mapping[str, np.ndarray], *, limit: float) -> Verdict:
    """Vectors farther from their own median in time than ``limit`` x 1.4826 MAD in any component.

    Parameters
    ----------
    parts : mapping of component name to ndarray (ny, nx)
        The frame to be judged, NaN where not to be judged. [velocity]
    stacks : mapping of component name to ndarray (nt, ny, nx)
        The frames of the window in time, the judged one among them. [velocity]
    limit : float
        [1]

    Source: Hampel identifier (Hampel 1974, J. Am. Stat. Assoc. 69:383-393, from memory).
    """
    _positive(limit, "limit")
    return _hampel({name: np.asarray(part, float) for name, part in parts.items()}, stacks, limit)


def _hampel(parts, stacks, limit) -> Verdict:
    """Distance of each part from the median over the first axis of its stack, in scaled MAD."""
    shape = _shape(parts)
    residual = np.full(shape, -np.inf)
    not_judged = np.zeros(shape, bool)
    present = np.logical_and.reduce([np.isfinite(part) for part in parts.values()])
    for name, part in parts.items():
        middle, count = column_median(np.asarray(stacks[name], float))
        spread, _ = column_median(np.abs(stacks[name] - middle))
        distance = np.abs(part - middle)
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = np.where(distance == 0, 0.0, distance / (MAD_TO_SIGMA * spread))
        residual = np.maximum(residual, ratio)
        not_judged |= np.broadcast_to(count < FEWEST_SAMPLES, shape)
    not_judged &= present
    residual[~present | not_judged] = np.nan
    return Verdict(residual > limit, residual, not_judged)


def _given(u, v, w) -> dict[str, np.ndarray]:
    return {
        name: np.asarray(part, float) for name, part in (("u", u), ("v", v), ("w", w)) if part is not None
    }


def _shape(parts) -> tuple[int, int]:
    shapes = {part.shape for part in parts.values()}
    if len(shapes) != 1:
        raise InputError(f"a test needs component arrays of one shape; it got {sorted(shapes) or 'none'}")
    return shapes.pop()


def _floors(floor, parts) -> dict[str, float]:
    floors = {name: float(floor[name] if isinstance(floor, Mapping) else floor) for name in parts}
    for name, value in floors.items():
        if not value >= 0:
            raise InputError(f"floor of {name} is {value}; give the expected noise level, zero or more")
    return floors


def _positive(value: float, name: str) -> None:
    if not value > 0:
        raise InputError(f"{name} is {value}; give a positive number")


def _outside(values, low, high, name) -> np.ndarray:
    if low is not None and high is not None and low > high:
        raise InputError(f"limits of {name} are {low} to {high}; give the lower one first")
    outside = np.zeros(values.shape, bool)
    if low is not None:
        outside |= values < low
    if high is not None:
        outside |= values > high
    return outside
