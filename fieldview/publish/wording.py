"""Numbers and units as people read them: rounded to their uncertainty, aligned, with a true minus."""

from __future__ import annotations

import math
import re

MINUS = "−"
FIGURE_SPACE = "\u2007"
POINT_SPACE = "\u2008"
_RAISED = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")


def unit_text(unit: str) -> str:
    """``m^2/s`` as ``m²/s``; a ratio has no text."""
    if unit == "1":
        return ""
    return re.sub(r"\^(-?\d+)", lambda power: power.group(1).translate(_RAISED), unit)


def with_unit(label: str, unit: str) -> str:
    """``Γ [m²/s]``, or the label alone where there is no unit."""
    shown = unit_text(unit)
    return f"{label} [{shown}]" if shown else label


def decimals_for(uncertainty: float | None, value: float | None = None, *, digits: int = 4) -> int:
    """Decimals that show two digits of the uncertainty, or ``digits`` of the value where there is none."""
    if uncertainty is not None and math.isfinite(uncertainty) and uncertainty > 0:
        # rounding first, so that 0.0997 counts as 0.10 and not as 0.100
        return 1 - math.floor(math.log10(float(f"{uncertainty:.1e}")))
    if value is None or not math.isfinite(value) or value == 0:
        return 0
    return digits - 1 - math.floor(math.log10(float(f"{abs(value):.{digits - 1}e}")))


def fixed(value: float | None, decimals: int, *, signed: bool = False) -> str:
    """A number with this many decimals (negative: rounded to tens), true minus, powers of ten if extreme."""
    if value is None or not math.isfinite(value):
        return "–"
    if decimals > 8 or abs(value) >= 1e7:
        exponent = math.floor(math.log10(abs(value))) if value else -decimals
        mantissa = fixed(value / 10.0**exponent, max(0, decimals + exponent), signed=signed)
        return f"{mantissa}·10{str(exponent).translate(_RAISED)}"
    rounded = round(value, decimals)
    text = f"{abs(rounded):.{max(0, decimals)}f}"
    if rounded < 0:
        return MINUS + text
    return "+" + text if signed and rounded > 0 else text


def pair(
    value: float | None, uncertainty: float | None, *, signed: bool = False, digits: int = 4
) -> tuple[str, str]:
    """Value and uncertainty as two texts of the same decimals; a dash for what is not there."""
    decimals = decimals_for(uncertainty, value, digits=digits)
    return fixed(value, decimals, signed=signed), fixed(uncertainty, decimals)


def plus_minus(value: float | None, uncertainty: float | None, unit: str, *, signed: bool = False) -> str:
    """``0.01130 ± 0.00025 m²/s``; without an uncertainty it says so."""
    shown, spread = pair(value, uncertainty, signed=signed)
    unit = unit_text(unit)
    tail = f" {unit}" if unit else ""
    if value is None:
        return "no value"
    return f"{shown} ± {spread}{tail}" if uncertainty is not None else f"{shown}{tail}, U unknown"


def short(value: float | None, *, digits: int = 3, signed: bool = False) -> str:
    """A number to so many significant digits, without trailing noise."""
    if value is None or not math.isfinite(value):
        return "–"
    if value == 0:
        return "0"
    return fixed(value, max(0, decimals_for(None, value, digits=digits)), signed=signed)


def percent(share: float | None) -> str:
    """``97 %``; a share just below one never reads 100 %."""
    if share is None:
        return "–"
    if share in (0.0, 1.0):
        return f"{share * 100:.0f} %"
    shown = min(max(share * 100, 0.1), 99.9)
    return f"{shown:.0f} %" if 1 <= shown < 99 else f"{shown:.1f} %"


def aligned(texts: list[str]) -> list[str]:
    """Texts padded with figure spaces so that, right-aligned, their decimal points stand in one line."""
    tails = [text.rpartition(".")[2] if "." in text else None for text in texts]
    widest = max((len(tail) for tail in tails if tail is not None), default=0)
    padded = []
    for text, tail in zip(texts, tails, strict=True):
        if widest == 0 or not any(c.isdigit() for c in text):
            padded.append(text)
        elif tail is None:
            padded.append(text + POINT_SPACE + FIGURE_SPACE * widest)
        else:
            padded.append(text + FIGURE_SPACE * (widest - len(tail)))
    return padded


def is_noise(value: float | None, uncertainty: float | None) -> bool:
    """Whether the value is smaller than its uncertainty: shown muted, never hidden."""
    return value is not None and uncertainty is not None and abs(value) < uncertainty


def nice_step(span: float, parts: int) -> float:
    """The round step (1, 2 or 5 times a power of ten) that cuts ``span`` into about ``parts``."""
    if not math.isfinite(span) or span <= 0:
        return 1.0
    raw = span / max(parts, 1)
    power = 10.0 ** math.floor(math.log10(raw))
    return next((m * power for m in (1, 2, 5) if m * power >= raw * 0.999), 10 * power)


def round_up(value: float) -> float:
    """The next number of the row 1, 1.5, 2, 3, 4, 5, 6, 8, 10 (times a power of ten)."""
    if not math.isfinite(value) or value <= 0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(value))
    return next((m * power for m in (1, 1.5, 2, 3, 4, 5, 6, 8) if m * power >= value * 0.9999), 10 * power)


def time_left(share: float, elapsed: float) -> str:
    """``about 12 s left`` from the share done and the seconds so far."""
    if share <= 0:
        return ""
    seconds = elapsed * (1 - share) / share
    if seconds < 90:
        return f"about {max(1, round(seconds))} s left"
    return f"about {round(seconds / 60)} min left"
