"""Winding number of the velocity along a contour: the sum of the indices of the critical points inside."""

from __future__ import annotations

import numpy as np

from fieldview.compute.contour import Contour

_POINTS = np.linspace(-0.5, 0.5, 5)
"""Places on a piece at which the direction is looked at; the velocity along it is a parabola."""

_CLEARLY = 3.0
"""Speed in terms of its standard uncertainty from which a direction is sure enough."""


def index(contour: Contour) -> tuple[int | None, str]:
    """Winding number along a closed, wholly measured contour, or None and the reason.

    None where the speed somewhere vanishes or is not three times its uncertainty, for which the larger
    sigma of the corners' components stands. Without a sigma only a vanishing speed is seen.
    """
    prepared, pieces = contour.prepared, contour.pieces
    corners = prepared.velocity[contour.corner_nodes]
    a, b = (
        middle + _POINTS[:, None] * extent
        for middle, extent in ((pieces.a, pieces.da), (pieces.b, pieces.db))
    )
    velocity = ((1 - a) * corners[0] + a * corners[1]) * (1 - b) + ((1 - a) * corners[2] + a * corners[3]) * b
    speed = _least_speed(velocity)
    if speed.min() <= 1e-9 * np.abs(corners).max():
        return None, "the velocity vanishes on the contour: the index is not defined"
    spread = _spread(contour)
    if spread is not None:
        unsure = speed < _CLEARLY * spread
        if unsure.any():
            share = pieces.lengths[unsure].sum() / pieces.lengths.sum()
            near = f"within {_CLEARLY:g} standard uncertainties of zero on {share:.1%} of the contour"
            return None, f"the speed is {near}: the index is not known"
    path = velocity.T.ravel()  # point by point along each piece, piece by piece
    turns = np.angle(np.roll(path, -1) * path.conj()).sum() / (2 * np.pi)
    return round(float(turns)), ""


def _least_speed(velocity: np.ndarray) -> np.ndarray:
    """Least distance of the chords between velocities (points, n) from no velocity: ndarray (n,).

    A contour through a critical point meets it between two of the points looked at.
    """
    start, step = velocity[:-1], np.diff(velocity, axis=0)
    square = np.abs(step) ** 2
    t = -(start * step.conj()).real / np.where(square > 0, square, 1.0)
    return np.abs(start + np.clip(t, 0.0, 1.0) * step).min(axis=0)


def _spread(contour: Contour) -> np.ndarray | float | None:
    error = contour.prepared.field.error
    if error.sigma is None or not {"u", "v"} <= set(error.sigma):
        return None
    shape = contour.grid.shape
    sigma = [error.sigma[name] for name in ("u", "v")]
    if all(np.ndim(part) == 0 for part in sigma):
        return float(max(sigma))
    larger = np.fmax(*(np.broadcast_to(np.asarray(part, float), shape) for part in sigma)).ravel()
    at_corners = larger[contour.corner_nodes]
    # filled vectors have no sigma of their own
    return np.nanmax(np.where(np.isnan(at_corners), -np.inf, at_corners), axis=0)
