"""What a region's numbers owe to the spacing of the nodes and to the size of the measuring window.

A gap is a linear functional of the vectors, so its own noise is known and can be told from its size.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldview.compute.contour import Contour, percent
from fieldview.compute.filling import FillMap
from fieldview.compute.linear import MeanRemoval
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.pair_variance import pair_variance
from fieldview.compute.prepared import Prepared

_TOO_WIDE = 0.1
"""Share of the enclosed absolute vorticity from which the window counts as too wide for an estimate.

For a Lamb-Oseen vortex and a contour of one core radius that is a window of about one core radius.
"""

_CLEARLY = 2.0
"""Standard deviations of its own noise by which a gap must stand out to be more than noise."""


@dataclass(frozen=True)
class Gap:
    """A gap of a pair of numbers.

    Attributes
    ----------
    value : complex or None
        Of the first and second number; None where it cannot be told.
    noise : complex
        Variance of each due to random errors, 0 where they are not known.
    reason : str
        Why there is none, or what is to be known of it.
    """

    value: complex | None
    noise: complex = 0j
    reason: str = ""

    @property
    def first(self) -> tuple[float | None, float]:
        return (None if self.value is None else self.value.real), self.noise.real

    @property
    def second(self) -> tuple[float | None, float]:
        return (None if self.value is None else self.value.imag), self.noise.imag


def resolution_gap(contour: Contour, reference: NodeWeights | None = None) -> Gap:
    """Cubic line less the reference, the bilinear line unless another is given."""
    if contour.cubic_share == 0:
        reason = (
            "no part of the contour has the 4 x 4 nodes of the cubic line: the resolution gap is not known"
        )
        return Gap(None, reason=reason)
    reason = ""
    if contour.cubic_share < 1:
        reason = (
            f"the resolution gap rests on the {percent(contour.cubic_share)} of the contour with a cubic line"
        )
    return _gap(contour.cubic - (reference or contour.bilinear), contour.prepared, reason)


def window_gap(contour: Contour, weights: NodeWeights) -> Gap:
    """What averaging over the measuring window (Wx, Wy) does to the numbers with these weights.

    Averaging changes the velocity by (Wx^2 d2/dx2 + Wy^2 d2/dy2) U / 24 to leading order. The second
    differences are taken at the nodes, so that on a closed contour, by Stokes's theorem, the first number's
    gap is the integral of (Wx^2/24) dw/dx dy - (Wy^2/24) dw/dy dx, w the vorticity.
    """
    prepared = contour.prepared
    window = prepared.field.error.window
    if window is None:
        return Gap(None, reason="the size of the measuring window is not stated: the window gap is not known")
    if max(window) == 0:
        return Gap(0j)
    parts = []
    for size, axis in zip(window, ("x", "y"), strict=True):
        if size > 0:
            part = _second_differences(weights, prepared, axis)
            if part is None:
                reason = (
                    "too few nodes beside the contour for second differences: the window gap is not known"
                )
                return Gap(None, reason=reason)
            parts.append(part.times(size**2 / 24))
    nodes = np.concatenate([part.nodes for part in parts])
    found = NodeWeights.gathered(nodes, np.concatenate([part.values for part in parts]))
    smoothed = any(not isinstance(change, FillMap | MeanRemoval) for change in prepared.field.maps)
    reason = "smoothing widens the measuring window; the window gap does not contain that" if smoothed else ""
    gap = _gap(found, prepared, reason)
    size, spread = abs(gap.value.real), gap.noise.real**0.5
    if size > _CLEARLY * spread and size > _TOO_WIDE * _strength(contour):
        reason = "the measuring window is about as large as the structure: the window gap is not estimable"
        return Gap(None, reason=reason)
    return gap


def _strength(contour: Contour) -> float:
    """What the first number could be: absolute vorticity enclosed, or absolute velocity along the line."""
    prepared = contour.prepared
    if contour.shape.closed:
        return float(prepared.vorticity_size_sums.integral(contour.area_pieces))
    pieces = contour.pieces
    speeds = np.abs(prepared.velocity)[contour.corner_nodes].mean(axis=0)
    return float((speeds * pieces.lengths[contour.measured]).sum())


def _gap(weights: NodeWeights, prepared: Prepared, reason: str) -> Gap:
    noise = pair_variance(weights, prepared.field)
    spread = 0j if noise is None else complex(noise.first, noise.second)
    return Gap(prepared.of_pair(weights), spread, reason)


def _second_differences(weights: NodeWeights, prepared: Prepared, axis: str) -> NodeWeights | None:
    """Weights on the values of weights on their second derivatives; None where a node has none.

    Three-point differences about the node itself, else, where a gap or edge is in the way, about a
    neighbour (of first order).
    """
    nx = prepared.grid.shape[1]
    lines, step = (prepared.grid.x, 1) if axis == "x" else (prepared.grid.y, nx)
    if lines.size < 3:
        return None
    weights = weights.without_zeros()
    place = weights.nodes % nx if axis == "x" else weights.nodes // nx
    valid = prepared.valid.ravel()
    middle = np.full(place.size, -1)
    for shift in (0, 1, -1):
        at = place + shift
        open_ = np.flatnonzero((middle < 0) & (at >= 1) & (at <= lines.size - 2))
        nodes = weights.nodes[open_] + shift * step
        whole = valid[nodes] & valid[nodes - step] & valid[nodes + step]
        middle[open_[whole]] = at[open_[whole]]
    if (middle < 0).any():
        return None
    before, after = lines[middle] - lines[middle - 1], lines[middle + 1] - lines[middle]
    shares = np.stack(
        [2 / (before * (before + after)), -2 / (before * after), 2 / (after * (before + after))]
    )
    first = weights.nodes + (middle - 1 - place) * step
    nodes = first + step * np.arange(3)[:, None]
    return NodeWeights.gathered(nodes.ravel(), (shares * weights.values).ravel())
