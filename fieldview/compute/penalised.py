"""Penalised least squares in the cosine domain."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse as sp

from fieldview.compute.errors import InputError

GCV_NOTE = (
    "the smoothing was chosen by generalised cross-validation, which takes errors for independent: where "
    "neighbouring errors are correlated it smooths too little"
)

_CLOSE_ENOUGH = 1e-10
"""Relative residual at which the equations of a field with gaps count as solved."""

_ROUNDS = 6
"""Times that values in gaps are made anew while the strength of the smoothing is looked for."""


@dataclass(frozen=True, eq=False)
class PenalisedMap:
    """Values z of the smooth surface that minimises |W (z - y)|^2 + s |Lz|^2, L the discrete Laplacian.

    W is 1 at valid nodes and 0 elsewhere; the ends are mirrored. Without gaps z is the inverse cosine
    transform of the transform of y times 1 / (1 + s lambda^2); with gaps (W + s L^2) z = W y is solved by
    conjugate gradients. The matrix is the same read either way once it is cut down to valid nodes.

    Attributes
    ----------
    valid : bool ndarray (ny, nx)
    strength : float
        s, the weight of the roughness. [1]
    exact, note
        As of every map; the note speaks of the cross-validation where it chose the strength.
    """

    valid: np.ndarray
    strength: float
    exact: bool = True
    note: str = ""

    def forward(self, values: np.ndarray) -> np.ndarray:
        """(n,) or (n, k) to the same shape."""
        values = np.asarray(values, float)
        if values.ndim == 2:
            return np.column_stack([self.forward(column) for column in values.T])
        known = np.where(self.valid, values.reshape(self.valid.shape), 0.0)
        return np.where(self.valid, self.surface(known), 0.0).ravel()

    def transpose(self, weights: np.ndarray) -> np.ndarray:
        return self.forward(weights)

    def rows(self, nodes: np.ndarray) -> sp.csr_array:
        units = np.zeros((self.valid.size, len(nodes)))
        units[nodes, np.arange(len(nodes))] = 1.0
        return sp.csr_array(self.transpose(units).T)

    @cached_property
    def matrix(self) -> np.ndarray:
        """The whole matrix, dense (n, n): for small grids only."""
        from scipy.fft import dctn, idctn
        from scipy.linalg import solve

        ny, nx = shape = self.valid.shape
        penalty = self.strength * _laplacian_eigenvalues(shape) ** 2
        units = np.eye(self.valid.size).reshape(-1, ny, nx)
        system = idctn(penalty * dctn(units, axes=(1, 2), norm="ortho"), axes=(1, 2), norm="ortho")
        there = self.valid.ravel().astype(float)
        system = system.reshape(self.valid.size, -1) + np.diag(there)
        return there[:, None] * solve(system, np.diag(there), assume_a="pos")

    def surface(self, known: np.ndarray) -> np.ndarray:
        """The smooth surface (ny, nx) over all nodes, of values that are 0 where not valid."""
        penalty = self.strength * _laplacian_eigenvalues(self.valid.shape) ** 2
        if self.valid.all():
            return _transformed(known, 1 / (1 + penalty))
        return _solved(self.valid, known, penalty)


def penalised_map(
    valid: np.ndarray, *, width: float | None = None, values: Mapping[str, np.ndarray] | None = None
) -> PenalisedMap:
    """The map for a given half-power wavelength, or the one that generalised cross-validation chooses.

    Parameters
    ----------
    valid : bool ndarray (ny, nx)
    width : float, optional
        Wavelength along an axis that is reduced to half its amplitude. [nodes]
    values : mapping of component name to ndarray (ny, nx), optional
        Needed where ``width`` is left out; one strength is chosen for all components together.

    Source: Garcia (2010) Comput. Stat. Data Anal. 54:1167-1178.
    """
    if width is not None:
        if width < 2:
            raise InputError(f"the wavelength of a penalised smoothing is {width}; give 2 nodes or more")
        return PenalisedMap(valid, float((2 - 2 * np.cos(2 * np.pi / width)) ** -2.0))
    if not values:
        raise InputError("penalised smoothing without a width needs the components' values to choose one")
    if not valid.any():
        return PenalisedMap(valid, 1.0)
    return PenalisedMap(valid, _cross_validated(valid, list(values.values())), note=GCV_NOTE)


def _laplacian_eigenvalues(shape: tuple[int, int]) -> np.ndarray:
    """Eigenvalues (ny, nx) of the mirrored Laplacian with unit spacing, Garcia (2010), eq. 4 and 24."""
    along = [2 - 2 * np.cos(np.pi * np.arange(size) / size) for size in shape]
    return along[0][:, None] + along[1]


def _transformed(values: np.ndarray, gain: np.ndarray) -> np.ndarray:
    from scipy.fft import dctn, idctn

    return idctn(gain * dctn(values, norm="ortho"), norm="ortho")


def _solved(valid: np.ndarray, known: np.ndarray, penalty: np.ndarray) -> np.ndarray:
    """(W + s L^2) z = W y by conjugate gradients, prepared with the same operator without gaps."""
    share = valid.mean()
    gain = 1 / (share + penalty)
    z = _transformed(known, gain)
    residual = known - (np.where(valid, z, 0.0) + _transformed(z, penalty))
    goal = _CLOSE_ENOUGH * np.linalg.norm(known)
    direction, ready, product = 0.0, None, None
    for _ in range(1000):
        if np.linalg.norm(residual) <= goal:
            break
        ready = _transformed(residual, gain)
        previous, product = product, float((residual * ready).sum())
        direction = ready + (0.0 if previous is None else product / previous) * direction
        image = np.where(valid, direction, 0.0) + _transformed(direction, penalty)
        step = product / float((direction * image).sum())
        z = z + step * direction
        residual = residual - step * image
    return z


def _cross_validated(valid: np.ndarray, parts: list[np.ndarray]) -> float:
    """Strength with the least generalised cross-validation score over all components, Garcia (2010), eq. 14.

    With gaps the missing values are those of the smooth surface itself, made anew for every strength tried
    until it stays: section 2.3 there.
    """
    from scipy.fft import dctn

    known = [np.where(valid, part - part[valid].mean(), 0.0) for part in parts]
    log_strength, whole = 0.0, bool(valid.all())
    for _ in range(1 if whole else _ROUNDS):
        if not whole:
            surface = PenalisedMap(valid, 10.0**log_strength)
            known = [np.where(valid, part, surface.surface(part * valid)) for part in known]
        power = sum(dctn(part, norm="ortho") ** 2 for part in known)
        before, log_strength = log_strength, _least_score(power, np.count_nonzero(valid))
        if abs(log_strength - before) < 0.02:
            break
    return 10.0**log_strength


def _least_score(power: np.ndarray, count: int) -> float:
    """Logarithm of the strength with the least score, from squared cosine coefficients (ny, nx)."""
    from scipy.optimize import minimize_scalar

    roughness = _laplacian_eigenvalues(power.shape) ** 2

    def score(log_strength: float) -> float:
        gain = 1 / (1 + 10.0**log_strength * roughness)
        return float(((1 - gain) ** 2 * power).sum()) / count / (1 - float(gain.mean())) ** 2

    return float(minimize_scalar(score, bounds=(-4.0, 6.0), method="bounded", options={"xatol": 0.01}).x)
