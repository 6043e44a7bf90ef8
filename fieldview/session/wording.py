"""Figures in sentences."""

from __future__ import annotations


def figure(value: float, digits: int = 4) -> str:
    """A number for a sentence: at most ``digits`` significant digits, no trailing zeros, a true minus."""
    text = f"{value:.{digits}g}"
    return text.replace("-", "−")
