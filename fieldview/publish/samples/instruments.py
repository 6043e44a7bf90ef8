"""How the invented instruments see a flow: window averages, correlated noise, rounding."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np

from fieldview.session.models import Session
from fieldview.session.replay import Workbench
from fieldview.session.store import save_session

Flow = Callable[[np.ndarray, np.ndarray], tuple[np.ndarray, np.ndarray]]
"""(x, y) -> (u, v)"""


def vortex(x: np.ndarray, y: np.ndarray, *, circulation: float, core: float) -> tuple[np.ndarray, np.ndarray]:
    """Velocity of a Lamb–Oseen vortex at the origin."""
    r2 = np.maximum(x**2 + y**2, 1e-30)
    turn = circulation / (2 * np.pi * r2) * -np.expm1(-r2 / core**2)
    return -turn * y, turn * x


def seen_through_window(
    flow: Flow, x: np.ndarray, y: np.ndarray, window: float
) -> tuple[np.ndarray, np.ndarray]:
    """Mean of a flow over a square window round every node, by Gauss's rule with 4 x 4 points."""
    places, weights = np.polynomial.legendre.leggauss(4)
    u, v = np.zeros_like(x), np.zeros_like(x)
    for dx, wx in zip(places * window / 2, weights / 2, strict=True):
        for dy, wy in zip(places * window / 2, weights / 2, strict=True):
            part = flow(x + dx, y + dy)
            u += wx * wy * part[0]
            v += wx * wy * part[1]
    return u, v


def half_overlap_noise(rng: np.random.Generator, shape: tuple[int, int], sigma: float) -> np.ndarray:
    """Noise of windows that overlap by half: a node sees two by two cells, neighbours share half of them."""
    cells = rng.normal(size=(shape[0] + 1, shape[1] + 1))
    return 0.5 * sigma * (cells[1:, 1:] + cells[1:, :-1] + cells[:-1, 1:] + cells[:-1, :-1])


def text(columns: dict[str, np.ndarray], decimals: Sequence[int], *, delimiter=",", decimal=".") -> bytes:
    """A table with so many decimals per column; what is missing is left empty."""

    def cell(value: float, places: int) -> str:
        if np.isnan(value):
            return ""
        shown = f"{value:.{places}f}"
        shown = shown.removeprefix("-") if float(shown) == 0 else shown
        return shown.replace(".", decimal)

    lines = [delimiter.join(columns)]
    for row in zip(*(np.ravel(column) for column in columns.values()), strict=True):
        lines.append(delimiter.join(map(cell, row, decimals)))
    return ("\n".join(lines) + "\n").encode()


def save_with_digests(document: dict, folder: Path, name: str) -> Path:
    """Write a session beside its run, with the digests of the run's files."""
    session = Session.model_validate(document).in_folder(folder)
    path = folder / f"{name}.session.json"
    save_session(Workbench(session).with_digests(), path)
    return path
