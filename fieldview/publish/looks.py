"""Colours and dashes that the window and the figures share, and colour maps made in even steps."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

REGION_COLOURS = ("#0072b2", "#d55e00", "#009e73", "#cc79a7", "#e69f00", "#56b4e9")
"""Okabe & Ito (2008), the ones that show on white and on near-black alike."""

COLOUR_WORDS = ("blue", "vermilion", "green", "purple", "orange", "sky blue")

REGION_DASHES = ((), (6, 3), (2, 2.5), (9, 3, 2, 3), (12, 4), (4, 2, 1, 2, 1, 2))
"""One dash per region as well, in pen widths, so that colour is never the only sign."""

SIGNED_MAP = ("#1f5a96", "#f7f5f1", "#9c4613")
"""Ends and middle of the map of signed quantities on white."""

UNSIGNED_MAP = ("#f4f6f3", "#5d9fb4", "#173a5c")
"""From nothing to much on white, even in lightness."""

CYCLIC_MAP = ("#1f5a96", "#f7f5f1", "#9c4613", "#3a3f47", "#1f5a96")
"""Once round for angles."""

INK, MUTED, FILLED, ATTENTION = "#1b2a41", "#55647a", "#5f3f9b", "#a34a17"
"""Text and arrows, what stands back, filled vectors, rejected ones; on white."""


def rgb_of(colour: str) -> tuple[float, float, float]:
    """Red, green and blue of ``#rrggbb``, 0 to 1."""
    return tuple(int(colour[place : place + 2], 16) / 255 for place in (1, 3, 5))


@lru_cache(maxsize=8)
def diverging(low: str, middle: str, high: str) -> np.ndarray:
    """256 colours from ``low`` over ``middle`` to ``high``, in even steps of CIE L*a*b* along both arms."""
    ends = [_to_lab(colour) for colour in (low, middle, high)]
    # both arms reach the same lightness, so that neither sign looks stronger
    ends[0][0] = ends[2][0] = (ends[0][0] + ends[2][0]) / 2
    share = np.linspace(0, 2, 256)
    lab = np.column_stack([np.interp(share, [0, 1, 2], [end[i] for end in ends]) for i in range(3)])
    return _from_lab(lab)


_RGB_TO_XYZ = np.array(
    [[0.4124564, 0.3575761, 0.1804375], [0.2126729, 0.7151522, 0.0721750], [0.0193339, 0.1191920, 0.9503041]]
)
"""sRGB primaries and D65 white (IEC 61966-2-1)."""

_WHITE = _RGB_TO_XYZ.sum(axis=1)


def _to_lab(colour: str) -> np.ndarray:
    """CIE 1976 L*a*b* of a colour, relative to D65."""
    rgb = np.array(rgb_of(colour))
    linear = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    x, y, z = np.cbrt(_RGB_TO_XYZ @ linear / _WHITE)  # above 0.9 % of white, as all colours here are
    return np.array([116 * y - 16, 500 * (x - y), 200 * (y - z)])


def _from_lab(lab: np.ndarray) -> np.ndarray:
    """uint8 ndarray (n, 3) of colours given as L*a*b* (n, 3)."""
    y = (lab[:, 0] + 16) / 116
    xyz = np.column_stack([y + lab[:, 1] / 500, y, y - lab[:, 2] / 200]) ** 3 * _WHITE
    linear = np.clip(xyz @ np.linalg.inv(_RGB_TO_XYZ).T, 0, 1)
    rgb = np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1 / 2.4) - 0.055)
    return (rgb * 255).round().astype(np.uint8)


@lru_cache(maxsize=8)
def even_steps(*colours: str) -> np.ndarray:
    """256 colours through these, in even steps of CIE L*a*b* between them: uint8 (256, 3)."""
    ends = [_to_lab(colour) for colour in colours]
    share, places = np.linspace(0, len(ends) - 1, 256), np.arange(len(ends))
    return _from_lab(np.column_stack([np.interp(share, places, [end[i] for end in ends]) for i in range(3)]))


def luminance(colour: str) -> float:
    """Relative luminance as in WCAG 2.1."""
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in rgb_of(colour)]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
