"""Proper orthogonal decomposition of a run by the method of snapshots, with gaps.

Source: Sirovich (1987) Q. Appl. Math. 45:561-571. Gaps are filled by the modes themselves, over and over
until they settle (Everson & Sirovich 1995, J. Opt. Soc. Am. A 12:1657-1664); how many modes serve for that is
found by hiding some measured vectors and predicting them (Beckers & Rixen 2003, J. Atmos. Ocean. Technol.
20:1839-1856) (all from memory).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError

LEAST_SHARE = 0.5
"""Share of frames a node must be measured in to take part."""

_HIDDEN = 0.03
"""Share of the measured vectors that is hidden to find the number of modes for the gaps."""

_MOST_GAP_MODES = 20
_ROUNDS = 100
_SETTLED = 2e-3
"""Change of the filled values per round, relative to the fluctuation, at which filling ends: well below what
noise leaves uncertain of them."""

_PATIENCE = 2
"""Numbers of modes tried beyond the best one before the search ends."""

_BETTER = 0.98
"""Ratio of the errors of the hidden vectors from which more modes are worth it; fewer settle sooner."""


@dataclass(frozen=True, eq=False)
class Modes:
    """Modes of a run, strongest first.

    Attributes
    ----------
    names : tuple of str
        Components.
    mean : ndarray (C, ny, nx)
        Mean of the frames, NaN at nodes that take no part. [velocity]
    modes : ndarray (K, C, ny, nx)
        Orthonormal under the node weights, summed over components; the sign makes the largest value
        positive. NaN at nodes that take no part. [1]
    coefficients : ndarray (N, K)
        Of the modes in each frame. [velocity]
    energies : ndarray (N',)
        Mean square coefficient of every mode there is, not only the K kept. [velocity^2]
    gap_share : float
        Share of the vectors taking part that was missing.
    gap_modes : int
        Modes the gaps were filled with; 0 where there were none.
    gap_error : float or None
        Root mean square error of the hidden vectors, where some were hidden. [velocity]
    settled : bool
        Whether the filling came to rest.
    nodes : bool ndarray (ny, nx)
        Nodes that take part.
    """

    names: tuple[str, ...]
    mean: np.ndarray
    modes: np.ndarray
    coefficients: np.ndarray
    energies: np.ndarray
    gap_share: float
    gap_modes: int
    gap_error: float | None
    settled: bool
    nodes: np.ndarray

    @property
    def shares(self) -> np.ndarray:
        """Share of each mode in the energy of the fluctuation."""
        total = self.energies.sum()
        return self.energies / total if total > 0 else np.zeros_like(self.energies)

    def energy_uncertainty(self, samples: float) -> np.ndarray:
        """Standard uncertainty of the energies from so many independent frames. [velocity^2]

        Source: North, Bell, Cahalan & Moeng (1982) Mon. Weather Rev. 110:699-706 (from memory): modes
        whose energies are closer than this are mixed with each other.
        """
        return self.energies * np.sqrt(2 / samples)

    def reconstruction(self, frame: int, *, count: int | None = None) -> dict[str, np.ndarray]:
        """A frame from the mean and its first ``count`` modes (all kept ones if left out), by component."""
        kept = self.modes.shape[0] if count is None else min(count, self.modes.shape[0])
        if not -len(self.coefficients) <= frame < len(self.coefficients):
            raise InputError(
                f"frame {frame} is not among the {len(self.coefficients)} the modes were made from"
            )
        values = self.mean + np.tensordot(self.coefficients[frame, :kept], self.modes[:kept], axes=1)
        return dict(zip(self.names, values, strict=True))


def decompose(
    snapshots: Mapping[str, np.ndarray],
    *,
    count: int = 10,
    weights: np.ndarray | None = None,
    gap_modes: int | None = None,
    least_share: float = LEAST_SHARE,
    seed: int = 0,
    on_round: Callable[[], None] | None = None,
) -> Modes:
    """Modes of the fluctuation about the mean.

    Parameters
    ----------
    snapshots : mapping of component name to ndarray (N, ny, nx)
        NaN where missing, in all components alike. [velocity]
    count : int
        Modes to keep, K.
    weights : ndarray (ny, nx), optional
        Area of each node; all alike if left out.
    gap_modes : int, optional
        Modes the gaps are filled with; found by hiding vectors if left out.
    least_share : float
        Nodes measured in a smaller share of the frames take no part.
    seed : int
        Of the choice of hidden vectors.
    on_round : callable, optional
        Called between rounds; what it raises ends the work.

    Raises
    ------
    InputError
        There are fewer than three frames, or no node is measured often enough.
    """
    names = tuple(snapshots)
    stack = np.stack([np.asarray(snapshots[name], float) for name in names], axis=1)
    frames, _, *shape = stack.shape
    if frames < 3 or count < 1:
        raise InputError(f"modes need three frames or more and a count from 1 on; got {frames} and {count}")
    there = np.isfinite(stack).all(axis=1)
    nodes = there.mean(axis=0) >= max(least_share, 2 / frames)
    if not nodes.any():
        raise InputError(f"no node is measured in {100 * least_share:g} % of the frames; modes need some")
    root = np.sqrt(np.ones(shape) if weights is None else np.asarray(weights, float))[nodes]
    root = np.tile(root / np.sqrt(np.mean(root**2)), len(names))
    values = stack[:, :, nodes].reshape(frames, -1)
    known = np.tile(there[:, nodes], (1, len(names)))
    values, filling = _filled(values * root, known, gap_modes, seed, on_round or (lambda: None))
    mean = values.mean(axis=0)
    left, strength, right = _decomposed(values - mean)
    kept = min(count, strength.size)
    signs = np.sign(right[np.arange(kept), np.abs(right[:kept]).argmax(axis=1)])
    coefficients = left[:, :kept] * strength[:kept] * signs

    def map_of(rows):
        full = np.full((*rows.shape[:-1], len(names), *shape), np.nan)
        full[..., nodes] = rows.reshape(*rows.shape[:-1], len(names), -1)
        return full

    return Modes(
        names=names,
        mean=map_of(mean / root),
        modes=map_of(right[:kept] * signs[:, None] / root),
        coefficients=coefficients,
        energies=strength**2 / frames,
        gap_share=float(1 - known.mean()),
        nodes=nodes,
        **filling,
    )


def _decomposed(away: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Left vectors (N, M), singular values (M,) and right vectors (M, n), without those of round-off.

    By the matrix of the snapshots' inner products (N, N), which is small where frames are few beside nodes;
    otherwise by that of the nodes.
    """
    frames, size = away.shape
    if frames <= size:
        square, left = np.linalg.eigh(away @ away.T)
        order = np.argsort(square)[::-1]
        square, left = square[order], left[:, order]
        some = square > max(square[0], 0.0) * frames * 1e-14
        strength, left = np.sqrt(square[some]), left[:, some]
        return left, strength, (left.T @ away) / strength[:, None]
    square, right = np.linalg.eigh(away.T @ away)
    order = np.argsort(square)[::-1]
    square, right = square[order], right[:, order].T
    some = square > max(square[0], 0.0) * size * 1e-14
    strength, right = np.sqrt(square[some]), right[some]
    return (away @ right.T) / strength, strength, right


# --- gaps ------------------------------------------------------------------------------------------


def _filled(values, known, gap_modes, seed, on_round):
    """Values with their gaps filled, and what is to be said of it."""
    if known.all():
        return values, {"gap_modes": 0, "gap_error": None, "settled": True}
    if gap_modes is not None:
        filled, settled = _fill_with(values, known, gap_modes, on_round)
        return filled, {"gap_modes": gap_modes, "gap_error": None, "settled": settled}
    # whole vectors are hidden: half of one would give away the other
    components = known.shape[1]
    hidden = known & (np.random.default_rng(seed).random((known.shape[0], components)) < _HIDDEN)
    best, error = 0, _hidden_error(_with_means(values, known & ~hidden), values, hidden)
    start = _with_means(values, known & ~hidden)
    for modes in range(1, min(_MOST_GAP_MODES, known.shape[0] - 1) + 1):
        start, _ = _fill_with(values, known & ~hidden, modes, on_round, start=start)
        found = _hidden_error(start, values, hidden)
        if found < _BETTER * error:
            best, error = modes, found
        elif modes - best >= _PATIENCE:
            break
    filled, settled = _fill_with(values, known, best, on_round)
    return filled, {"gap_modes": best, "gap_error": error, "settled": settled}


def _with_means(values, known):
    number = np.maximum(known.sum(axis=0), 1)
    means = np.where(known, values, 0.0).sum(axis=0) / number
    return np.where(known, values, means)


def _fill_with(values, known, modes, on_round, *, start=None):
    """Gaps replaced by what so many modes make of the rest, until that changes no more."""
    filled = _with_means(values, known) if start is None else np.where(known, values, start)
    if modes == 0:
        return filled, True
    scale = np.sqrt(np.mean((filled - filled.mean(axis=0)) ** 2))
    for _ in range(_ROUNDS):
        on_round()
        mean = filled.mean(axis=0)
        left, strength, right = _decomposed(filled - mean)
        kept = min(modes, strength.size)
        guess = mean + (left[:, :kept] * strength[:kept]) @ right[:kept]
        change = np.sqrt(np.mean((guess - filled)[~known] ** 2))
        filled = np.where(known, values, guess)
        if change <= _SETTLED * scale:
            return filled, True
    return filled, False


def _hidden_error(filled, values, hidden) -> float:
    return float(np.sqrt(np.mean((filled - values)[hidden] ** 2))) if hidden.any() else float("inf")
