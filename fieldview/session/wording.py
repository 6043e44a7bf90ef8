"""Figures in sentences."""

from __future__ import annotations

import math


def known_number(value) -> float | None:
    """A number, or None where it is none or not finite: for strict JSON."""
    return None if value is None or not math.isfinite(value) else float(value)


def figure(value: float, digits: int = 4) -> str:
    """A number for a sentence: at most ``digits`` significant digits, no trailing zeros, a true minus."""
    text = f"{value:.{digits}g}"
    return text.replace("-", "−")
