"""The measured lattice and its rigid place in the plane."""

from __future__ import annotations

import cmath
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from fieldview.compute.errors import InputError


@dataclass(frozen=True)
class Placement:
    """A rigid map from the lattice to the plane: ``z -> factor * z + shift``, z = x + iy.

    With ``mirrored`` the lattice's z is conjugated first. ``factor`` has modulus 1. Velocities
    transform with ``factor`` (and the conjugation) alone, as a vector's components do.
    """

    factor: complex = 1 + 0j
    shift: complex = 0j
    mirrored: bool = False

    @property
    def is_identity(self) -> bool:
        return self == Placement()

    def to_plane(self, z):
        """Plane coordinates (complex) of lattice coordinates."""
        return self.factor * (np.conj(z) if self.mirrored else z) + self.shift

    def to_lattice(self, z):
        """Lattice coordinates (complex) of plane coordinates."""
        back = (z - self.shift) * self.factor.conjugate()
        return np.conj(back) if self.mirrored else back

    def vector_to_plane(self, velocity):
        """Plane components u + iv of a vector given as lattice components."""
        return self.factor * (np.conj(velocity) if self.mirrored else velocity)

    def vector_to_lattice(self, velocity):
        """Lattice components u + iv of a vector given as plane components."""
        back = velocity * self.factor.conjugate()
        return np.conj(back) if self.mirrored else back

    def then(
        self, *, turn: float = 0.0, about: complex = 0j, reflect: str | None = None, shift: complex = 0j
    ):
        """This placement followed by new axes.

        The axes are turned by ``turn`` [rad], counter-clockwise, about ``about``: a fixed point then
        reads turned by ``-turn``. ``reflect`` "x" or "y" reverses that axis about the same point, and
        ``shift`` is added to the coordinates last.
        """
        turned = cmath.exp(-1j * turn)
        # q = turned * (p - about); reflected in x: -conj(q), in y: conj(q); then + about + shift
        sign = {None: 1, "x": -1, "y": 1}[reflect]
        factor, offset, mirrored = turned * self.factor, turned * (self.shift - about), self.mirrored
        if reflect is not None:
            factor, offset, mirrored = factor.conjugate(), offset.conjugate(), not mirrored
        return Placement(sign * factor, sign * offset + about + shift, mirrored)


@dataclass(frozen=True, eq=False)
class Grid:
    """Strictly increasing axes of the lattice, arrays are ``[iy, ix]``, and its place in the plane.

    Parameters
    ----------
    x : ndarray (nx,)
        Column positions on the lattice. [length]
    y : ndarray (ny,)
        Row positions on the lattice. [length]
    placement : Placement
        Rigid map from lattice to plane coordinates.

    Raises
    ------
    InputError
        An axis is empty, not finite or not strictly increasing.
    """

    x: np.ndarray
    y: np.ndarray
    placement: Placement = field(default_factory=Placement)

    def __post_init__(self):
        for name in ("x", "y"):
            axis = np.array(getattr(self, name), dtype=float).reshape(-1)
            if axis.size == 0 or not np.isfinite(axis).all() or (np.diff(axis) <= 0).any():
                raise InputError(f"the {name} axis of the grid must be finite and strictly increasing")
            axis.setflags(write=False)
            object.__setattr__(self, name, axis)

    @property
    def shape(self) -> tuple[int, int]:
        """(ny, nx)"""
        return self.y.size, self.x.size

    @property
    def spacing(self) -> tuple[float, float]:
        """Mean spacing along x and y; NaN along an axis of one node. [length]"""
        return _mean_spacing(self.x), _mean_spacing(self.y)

    @cached_property
    def is_uniform(self) -> tuple[bool, bool]:
        """Whether x and y are evenly spaced, to 1e-6 of the spacing."""
        return _even(self.x), _even(self.y)

    @property
    def is_plane(self) -> bool:
        """Whether there are cells at all: at least two nodes along both axes."""
        return self.x.size > 1 and self.y.size > 1

    @cached_property
    def nodes(self) -> np.ndarray:
        """Plane coordinates x + iy of every node: complex ndarray (ny, nx). [length]"""
        positions = self.placement.to_plane(self.x[None, :] + 1j * self.y[:, None])
        positions.setflags(write=False)
        return positions

    def same_nodes(self, other: Grid) -> bool:
        return (
            self.placement == other.placement
            and np.array_equal(self.x, other.x)
            and np.array_equal(self.y, other.y)
        )


def _mean_spacing(axis: np.ndarray) -> float:
    return float((axis[-1] - axis[0]) / (axis.size - 1)) if axis.size > 1 else float("nan")


def _even(axis: np.ndarray) -> bool:
    if axis.size < 3:
        return True
    return bool(np.ptp(np.diff(axis)) <= 1e-6 * _mean_spacing(axis))
