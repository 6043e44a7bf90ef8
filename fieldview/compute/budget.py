"""What the uncertainty of a region's number is made of, part by part.

u_c^2 = u_random^2 + sum of (sensitivity x u)^2 + (resolution gap^2 + window gap^2)/3 + u_filling^2.
Sensitivities are those of a contour that is fixed to the field: a different scale or pulse separation moves
the contour along with the vectors.
"""

from __future__ import annotations

import math

import numpy as np

from fieldview.compute.field import Field
from fieldview.compute.numbers import Contribution, Number
from fieldview.compute.units import PIXEL

LOWER_BOUND = "no correlation length is stated: every random uncertainty is a lower bound"
NO_SIGMA = "no sigma is stated: the random and the combined uncertainty are not known"


def random_part(variance: float | None) -> Contribution:
    return Contribution("random", "random", None, None if variance is None else math.sqrt(variance))


def systematic_parts(
    field: Field, value: float, *, scale: int, tilt: float = 0.0, offset: float = 0.0
) -> list[Contribution]:
    """Contributions of the errors common to all vectors.

    Parameters
    ----------
    field : Field
    value : float
    scale : int
        Power of the length scale in the value: 2 for circulation, flux and whatever is compared with them,
        3 for a flow through the area, 1 for a velocity, 0 for a vorticity.
    tilt : float
        Change of the value per radian between assumed and true axes. A closed contour has none.
    offset : float
        Change of the value per unit of a velocity common to all vectors. A closed contour has none.

    A relative error of the scale or pulse separation does not touch values still in pixels and pulses. A part
    whose sensitivity is 0 contributes 0, stated or not; else one that is not stated is not known.
    """
    calibrated = 1.0 if field.units != PIXEL else 0.0
    sensitivities = {
        "scale": scale * value * calibrated,
        "pulse_separation": value * calibrated,
        "gain": value,
        "axis_tilt": tilt,
        "zero_offset": offset,
    }
    stated = field.error.systematic
    return [
        Contribution(name, "systematic", float(c), _times(c, getattr(stated, name)))
        for name, c in sensitivities.items()
    ]


def _times(sensitivity: float, uncertainty: float | None) -> float | None:
    if sensitivity == 0:
        return 0.0
    return None if uncertainty is None else float(abs(sensitivity) * uncertainty)


def gap_part(name: str, gap: float | None, noise: float | None) -> Contribution:
    """A gap taken as the half-width of a uniform distribution, the gap's own noise variance taken off.

    That noise is in the random part already; what is left cannot fall below zero.
    """
    if gap is None:
        return Contribution(name, "gaps", None, None)
    square = max(gap * gap - (noise or 0.0), 0.0)
    return Contribution(name, "gaps", None, math.sqrt(square / 3))


def filling_part(uncertainty: float | None) -> Contribution:
    return Contribution("filling", "gaps", None, uncertainty)


def made(value, unit: str, *parts) -> Number:
    """A number with the contributions given singly or in lists; none where there is no value."""
    if value is None or not np.isfinite(value):
        return Number(None, unit)
    budget: list[Contribution] = []
    for part in parts:
        if part is not None:
            budget.extend([part] if isinstance(part, Contribution) else part)
    return Number(float(value), unit, tuple(budget))


def remarks(field: Field, numbers: list[Number]) -> list[str]:
    """What the reader of these numbers must know: parts not stated, and what the random part rests on."""
    budgets = [part for number in numbers for part in number.budget]
    said = []
    random = [part.uncertainty for part in budgets if part.kind == "random"]
    if None in random:
        said.append(NO_SIGMA if field.error.sigma is None else _incomplete(field))
    if any(random) and not field.error.correlation_stated:
        said.append(LOWER_BOUND)
    missing = [p.name for p in budgets if p.kind == "systematic" and p.uncertainty is None]
    if missing:
        names = ", ".join(name.replace("_", " ") for name in dict.fromkeys(missing))
        said.append(f"not stated and left out of the combined uncertainty: {names}")
    said.extend(dict.fromkeys(change.note for change in field.maps if change.note))
    return said


def _incomplete(field: Field) -> str:
    absent = [name for name in field.components if name not in field.error.sigma]
    if absent:
        return (
            f"no sigma is stated for {', '.join(absent)}: "
            "random and combined uncertainties that need it are not known"
        )
    return "sigma is missing at some of the vectors used: the random and combined uncertainty are not known"
