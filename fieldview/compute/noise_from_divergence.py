"""Noise of a planar incompressible flow from the divergence that should not be there."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from fieldview.compute.field import Field
from fieldview.compute.medians import MAD_TO_SIGMA
from fieldview.compute.quantities import quantity_map

FEWEST_NODES = 30


@dataclass(frozen=True)
class DivergenceNoise:
    """What the divergence of one frame implies.

    Attributes
    ----------
    sigma : float
        Standard deviation of the errors of u and v, taken as equal, that explains it. [velocity]
    ratio : float or None
        Typical size of the divergence over that expected from the stated sigma; None if none is stated.
    nodes : int
    """

    sigma: float
    ratio: float | None
    nodes: int


def divergence_noise(field: Field) -> DivergenceNoise | None:
    """Noise implied by the divergence at the nodes of a frame, None where it has too few of them.

    A divergence of a planar incompressible flow is error alone: noise, and what the scheme makes of the
    curvature of the flow, which only adds. Typical sizes are 1.4826 times medians, so that few outliers
    and few places with true divergence do not matter. A flow through the plane adds its own -dw/dz.
    """
    if not field.in_plane or not field.grid.is_plane:
        return None
    unit = replace(field.error, sigma={"u": 1.0, "v": 1.0}, turn=1 + 0j)
    found = quantity_map(field.with_(error=unit), "divergence")
    there = np.isfinite(found.values) & (found.uncertainty > 0)
    if there.sum() < FEWEST_NODES:
        return None
    implied = MAD_TO_SIGMA * float(np.median(np.abs(found.values / found.uncertainty)[there]))
    stated = quantity_map(field, "divergence").uncertainty
    ratio = None
    if stated is not None:
        known = there & (stated > 0)
        if known.any():
            ratio = MAD_TO_SIGMA * float(np.median(np.abs(found.values[known] / stated[known])))
    return DivergenceNoise(implied, ratio, int(there.sum()))
