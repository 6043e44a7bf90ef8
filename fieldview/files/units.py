"""Units of files: any that pint knows, turned into the program's own once, on reading."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import lru_cache

from fieldview.compute.errors import InputError

ALIASES = {
    "fpm": "foot/minute",
    "kt": "knot",
    "kts": "knot",
    "px": "image_pixel",
    "pix": "image_pixel",
    "pixel": "image_pixel",
    "pixels": "image_pixel",
    "pulses": "pulse",
    "sec": "second",
    "degrees": "degree",
    "deg": "degree",
    "°": "degree",
}
"""Ways of writing that are common in files and that pint takes for something else or not at all."""

NO_UNIT = ("", "-", "1", "none", "n/a", "dimensionless")

_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-")


@dataclass(frozen=True)
class Unit:
    """A unit as far as a velocity field is concerned.

    Attributes
    ----------
    kind : str
        "length", "pixel", "velocity", "pixel velocity" (px per pulse), "pixel rate" (px per time),
        "pulse velocity" (length per pulse), "time", "angle", "none" or "other".
    factor : float
        What one of it is in m, px, m/s, px/pulse, px/s, m/pulse, s or rad.
    """

    kind: str
    factor: float


_KINDS = {
    (): "none",
    (("[length]", 1),): "length",
    (("[image]", 1),): "pixel",
    (("[length]", 1), ("[time]", -1)): "velocity",
    (("[image]", 1), ("[pulses]", -1)): "pixel velocity",
    (("[image]", 1), ("[time]", -1)): "pixel rate",
    (("[length]", 1), ("[pulses]", -1)): "pulse velocity",
    (("[time]", 1),): "time",
}


@lru_cache(maxsize=256)
def parse_unit(text: str) -> Unit:
    """The unit written in a file or an answer, such as ``mm``, ``m s-1``, ``0.1 mm`` or ``px``.

    Raises InputError where no unit is written so.
    """
    if text.strip().lower() in NO_UNIT:
        return Unit("none", 1.0)
    if "frame" in text.lower():
        raise InputError(
            f'"{text}" does not say whether a frame is a pulse of the pair or a frame of the run; '
            "write px for displacements within a pair"
        )
    registry, pint = _registry()
    try:
        amount = registry.Quantity(1.0, "") * registry.parse_expression(_spelled_out(text))
        base = amount.to_base_units()
        factor = float(base.magnitude)
    except Exception as error:  # pint's parser raises whatever Python's tokenizer does
        if isinstance(error, pint.errors.OffsetUnitCalculusError):
            return Unit("other", 1.0)
        raise InputError(f'"{text}" is no unit that is known; write it like mm, m/s, ft/min or px') from None
    if not math.isfinite(factor) or factor <= 0:
        raise InputError(f'"{text}" is no unit; write it like mm, m/s, ft/min or px')
    if amount.units == registry.radian or "degree" in str(amount.units):
        return Unit("angle", factor)
    powers = tuple(sorted((name, round(float(power), 9)) for name, power in base.dimensionality.items()))
    return Unit(_KINDS.get(powers, "other"), factor)


def _spelled_out(text: str) -> str:
    """A unit as pint reads it: aliases, ``m s-1``, superscripts, raised dots."""
    text = text.strip().translate(_SUPERSCRIPTS).replace("µ", "u").replace("μ", "u")
    text = re.sub(r"[·⋅]|(?<=[A-Za-z])\.(?=[A-Za-z])", " ", text)
    text = re.sub(r"\bper\b", "/", text, flags=re.IGNORECASE)
    words = re.sub(r"[A-Za-z°]+", lambda word: ALIASES.get(word[0].lower(), word[0]), text)
    # a number straight after a unit's name is its power
    words = re.sub(r"(?<=[A-Za-z])\s*\^?\s*(-\d+|\d+)(?![\d.]*[A-Za-z])", r"**(\1)", words)
    return re.sub(r"(?<=[\w)])\s+(?=[A-Za-z(])", "*", words)


@lru_cache(maxsize=1)
def _registry():
    """One registry of our own, in which a pixel is no printer's length and a pulse separation counts."""
    import pint

    registry = pint.UnitRegistry()
    registry.define("image_pixel = [image]")
    registry.define("pulse = [pulses]")
    return registry, pint
