"""Vectors that stand where the particles were in the first image, moved to the middle of their way."""

from __future__ import annotations

import numpy as np

from fieldview.compute.derivatives import gradient
from fieldview.compute.field import Field
from fieldview.compute.units import PIXEL

_ROUNDS = 6
"""Each round leaves an error smaller by half the displacement's gradient; six reach round-off in practice."""


def to_midpoint(field: Field, *, pulse_separation: float | None) -> Field:
    """The field whose vectors belong to their nodes as midpoints of the displacements.

    A displacement d found at the first image's position p belongs to p + d/2. The values at the nodes
    follow from u(x) = U(x - d/2), with U as found and its local gradient, exactly so where U is linear.
    Left as they are, the vectors of a rotation have a divergence of -Omega^2 dt. Uncertainties are kept.
    """
    if not field.in_plane:
        return field
    half = 0.5 if field.units == PIXEL else 0.5 * pulse_separation
    slopes = {name: gradient(part, field.grid) for name, part in field.components.items()}
    moved = dict(field.components)
    for _ in range(_ROUNDS):
        dx, dy = half * moved["u"], half * moved["v"]
        moved = {
            name: part - _or_zero(dx * slopes[name].d_dx + dy * slopes[name].d_dy)
            for name, part in field.components.items()
        }
    return field.with_(**moved, measured={})


def _or_zero(shift: np.ndarray) -> np.ndarray:
    return np.where(np.isfinite(shift), shift, 0.0)
