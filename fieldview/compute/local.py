"""What is known of a field at its nodes: components, derivatives, place about a centre."""

from __future__ import annotations

from functools import cached_property

import numpy as np

from fieldview.compute.derivatives import combination
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field

DERIVATIVES = {"ux": ("u", 0), "uy": ("u", 1), "vx": ("v", 0), "vy": ("v", 1)}
"""Component and axis (0 for x, 1 for y, of the plane) of each derivative."""


class Local:
    """A field seen node by node; derivatives are made when asked for, and once.

    Parameters
    ----------
    field : Field
    scheme : str or None
        Derivative scheme; the field's own if None.
    centre : complex, (float, float) or None
        Point in the plane; the middle of the grid if None. [length]
    """

    def __init__(self, field: Field, scheme: str | None = None, centre=None):
        self.field = field
        self.scheme = field.derivative if scheme is None else scheme
        self._centre = centre
        self._fallback = np.zeros(0, np.intp)
        self._kept: dict[str, np.ndarray] = {}

    @property
    def ux(self) -> np.ndarray:
        return self._slope("ux")

    @property
    def uy(self) -> np.ndarray:
        return self._slope("uy")

    @property
    def vx(self) -> np.ndarray:
        return self._slope("vx")

    @property
    def vy(self) -> np.ndarray:
        return self._slope("vy")

    def combined(self, first: str, sign: int, second: str) -> np.ndarray:
        """Sum or difference of two derivatives, a fresh array; the derivatives themselves are not kept."""
        return self._made({first: 1, second: sign})

    @property
    def fallback_count(self) -> int:
        """Nodes where a derivative asked for so far is one-sided or of lower order."""
        return int(np.unique(self._fallback).size)

    @cached_property
    def outward(self) -> np.ndarray:
        """Unit vector away from the centre at every node, complex (ny, nx); NaN at the centre. [1]"""
        nodes = self.field.grid.nodes
        centre = self._centre
        if centre is None:
            centre = 0.5 * (nodes[0, 0] + nodes[-1, -1])
        elif not isinstance(centre, complex):
            centre = complex(*centre) if np.ndim(centre) else complex(centre)
        arms = nodes - centre
        distance = np.abs(arms)
        return np.where(distance > 0, arms / np.where(distance > 0, distance, 1.0), np.nan)

    @cached_property
    def axes(self) -> np.ndarray:
        """Components (2, 2) of the lattice's unit vectors: column k is lattice axis k in the plane."""
        placement = self.field.grid.placement
        columns = [complex(placement.vector_to_plane(arm)) for arm in (1 + 0j, 1j)]
        turned = np.array([[z.real for z in columns], [z.imag for z in columns]])
        # a quarter turn must not leave round-off where nothing of the other axis belongs
        return np.where(np.abs(turned) < 1e-15, 0.0, turned)

    def _slope(self, name: str) -> np.ndarray:
        if name not in self._kept:
            self._kept[name] = self._made({name: 1})
        return self._kept[name]

    def _made(self, factors: dict[str, int]) -> np.ndarray:
        """Sum of derivatives along the plane's axes, times these factors."""
        self._check_plane()
        shares: dict[tuple[str, str], float] = {}
        for name, factor in factors.items():
            component, axis = DERIVATIVES[name]
            for share, along in zip(self.axes[axis], ("x", "y"), strict=True):
                shares[component, along] = shares.get((component, along), 0.0) + factor * share
        terms = [
            (share, getattr(self.field, component), along)
            for (component, along), share in shares.items()
            if share != 0
        ]
        values, fallback = combination(terms, self.field.grid, scheme=self.scheme)
        self._fallback = np.concatenate([self._fallback, fallback])
        return values

    def _check_plane(self) -> None:
        if not self.field.grid.is_plane:
            raise InputError("the derivatives need at least two rows and two columns of nodes")
