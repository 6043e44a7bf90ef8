"""Quantities derived from a field at its nodes, each with its uncertainty map.

To add one: write its function below and enter it in `QUANTITIES`. The function takes what is known at the
nodes (`Local`) and gives the values and, called later and only if needed, their slopes with respect to
what it used; values, units, uncertainty, panel, command line and exports follow from these.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.local import Local
from fieldview.compute.units import Units


@dataclass(frozen=True)
class Quantity:
    """One entry of the glossary.

    Attributes
    ----------
    name, symbol, title : str
    group : str
        Heading it stands under: "Velocity", "Deformation" or "Structure".
    length, time : int
        Powers of the units of length and time.
    signed : bool
        Whether its sign has a meaning, so that a map is best centred on zero.
    needs : tuple of str
        Components without which it does not exist.
    of : callable
        `Local` to (values (ny, nx), slopes), see the module's text.
    angle : bool
        Whether it is an angle in radians.
    """

    name: str
    symbol: str
    title: str
    group: str
    length: int
    time: int
    signed: bool
    needs: tuple[str, ...]
    of: Callable
    angle: bool = False

    def unit(self, units: Units) -> str:
        return "rad" if self.angle else units.of(self.length, self.time)


@dataclass(frozen=True, eq=False)
class QuantityMap:
    """A quantity at every node.

    Attributes
    ----------
    values : ndarray (ny, nx)
        NaN where there is none. [unit]
    uncertainty : ndarray (ny, nx) or None
        Standard uncertainty from the random errors of the vectors, to first order. [unit]
    unit : str
    fallback_count : int
        Valid nodes whose derivatives are one-sided or of lower order.
    reason : str
        Why there is no uncertainty, or what is to be known about it; "" where there is nothing to say.
    """

    values: np.ndarray
    uncertainty: np.ndarray | None
    unit: str
    fallback_count: int
    reason: str = ""


def quantity(
    field: Field, name: str, *, scheme: str | None = None, centre: complex | None = None
) -> np.ndarray:
    """Values of a quantity at every node, in the plane's axes.

    Parameters
    ----------
    field : Field
    name : str
        One of `QUANTITIES`.
    scheme : str, optional
        Derivative scheme; the field's own if left out.
    centre : complex or (float, float), optional
        Point about which radial and tangential components are taken; the middle of the grid if left out.

    Returns
    -------
    ndarray (ny, nx)
        NaN where there is none. In the field's units.

    Raises
    ------
    InputError
        The name is not known, or the field lacks a component or a direction that it needs.
    """
    values, _ = _known(field, name).of(Local(field, scheme, centre))
    return values


def quantity_map(
    field: Field, name: str, *, scheme: str | None = None, centre: complex | None = None
) -> QuantityMap:
    """Values and standard uncertainties of a quantity at every node; arguments as of `quantity`.

    The uncertainty is exact for quantities linear in the velocities and of first order for the others.
    Correlation between neighbouring errors, filling and smoothing are followed.
    """
    from fieldview.compute.propagation import map_uncertainty

    known = _known(field, name)
    local = Local(field, scheme, centre)
    with np.errstate(divide="ignore", invalid="ignore"):
        values, slopes = known.of(local)
        uncertainty, reason = map_uncertainty(local, slopes, np.isfinite(values))
    return QuantityMap(values, uncertainty, known.unit(field.units), local.fallback_count, reason)


def _known(field: Field, name: str) -> Quantity:
    if name not in QUANTITIES:
        raise InputError(f'quantity "{name}" is not known; the quantities are: {", ".join(QUANTITIES)}')
    known = QUANTITIES[name]
    absent = [need for need in known.needs if need not in field.components]
    if absent:
        raise InputError(f"{name} needs the component {absent[0]}, which this field does not have")
    return known


# What each quantity is. Slopes are with respect to u, v, w and to ux = du/dx, uy = du/dy, vx, vy.


def _component(name: str) -> Callable:
    return lambda at: (getattr(at.field, name), lambda: {name: 1.0})


def _speed(at: Local):
    """Length of the vector in all the components measured. [velocity]"""
    values = np.sqrt(sum(part**2 for part in at.field.components.values()))
    return values, lambda: {name: part / values for name, part in at.field.components.items()}


def _direction(at: Local):
    """Angle of the in-plane vector, counter-clockwise from +x, in (-pi, pi]. [rad]"""
    u, v = at.field.u, at.field.v
    return np.arctan2(v, u), lambda: {"u": -v / (u**2 + v**2), "v": u / (u**2 + v**2)}


def _kinetic_energy(at: Local):
    """Half the square of the vector, per unit mass, in all the components measured. [velocity^2]"""
    parts = at.field.components
    return 0.5 * sum(part**2 for part in parts.values()), lambda: dict(parts)


def _radial(at: Local):
    """Component away from the centre; NaN at the centre itself. [velocity]"""
    out = at.outward
    return at.field.u * out.real + at.field.v * out.imag, lambda: {"u": out.real, "v": out.imag}


def _tangential(at: Local):
    """Component counter-clockwise about the centre; NaN at the centre itself. [velocity]"""
    out = at.outward
    return at.field.v * out.real - at.field.u * out.imag, lambda: {"u": -out.imag, "v": out.real}


def _vorticity(at: Local):
    return at.combined("vx", -1, "uy"), lambda: {"vx": 1.0, "uy": -1.0}


def _divergence(at: Local):
    return at.combined("ux", 1, "vy"), lambda: {"ux": 1.0, "vy": 1.0}


def _shear_strain(at: Local):
    """Tensor component (du/dy + dv/dx)/2. [1/time]"""
    return 0.5 * at.combined("uy", 1, "vx"), lambda: {"uy": 0.5, "vx": 0.5}


def _normal_strain(at: Local):
    """Half the difference of the diagonal, (du/dx - dv/dy)/2: shear strain in axes turned 45 deg. [1/time]"""
    return 0.5 * at.combined("ux", -1, "vy"), lambda: {"ux": 0.5, "vy": -0.5}


def _max_strain(at: Local):
    """Larger eigenvalue of the strain-rate tensor. [1/time]"""
    normal, shear = 0.5 * (at.ux - at.vy), 0.5 * (at.uy + at.vx)
    radius = np.hypot(normal, shear)

    def slopes():
        n, s = 0.5 * normal / radius, 0.5 * shear / radius
        return {"ux": 0.5 + n, "vy": 0.5 - n, "uy": s, "vx": s}

    return 0.5 * (at.ux + at.vy) + radius, slopes


def _q_criterion(at: Local):
    """Half of (square norm of the rotation-rate tensor - that of the strain-rate tensor). [1/time^2]

    Source: Hunt, Wray & Moin (1988), Center for Turbulence Research CTR-S88 (from memory), with the
    in-plane part of the tensors.
    """
    values = -0.5 * (at.ux**2 + at.vy**2) - at.uy * at.vx
    return values, lambda: {"ux": -at.ux, "vy": -at.vy, "uy": -at.vx, "vx": -at.uy}


def _okubo_weiss(at: Local):
    """Square of the strain rate less square of the vorticity: (ux - vy)^2 + (vx + uy)^2 - (vx - uy)^2.

    Source: Okubo (1970) Deep-Sea Res. 17:445-454; Weiss (1991) Physica D 48:273-294 (from memory).
    """
    stretch = at.ux - at.vy

    def slopes():
        return {"ux": 2 * stretch, "vy": -2 * stretch, "uy": 4 * at.vx, "vx": 4 * at.uy}

    return stretch**2 + 4 * at.uy * at.vx, slopes


def _swirling_strength(at: Local):
    """Imaginary part of the velocity gradient's complex eigenvalues, 0 where they are real. [1/time]

    Where it is 0 it has no slope, hence no first-order uncertainty. Source: Zhou et al. (1999) J. Fluid
    Mech. 387:353-396.
    """
    half = 0.5 * (at.ux - at.vy)
    square = -(half**2) - at.uy * at.vx
    values = np.sqrt(np.maximum(square, 0.0))

    def slopes():
        scale = np.where(values > 0, 0.5 / values, np.nan)
        return {"ux": -half * scale, "vy": half * scale, "uy": -at.vx * scale, "vx": -at.uy * scale}

    return values, slopes


_PLANE = ("u", "v")
# heading, power of length, power of time
_VELOCITY = ("Velocity", 1, -1)
_ENERGY = ("Velocity", 2, -2)
_RATE = ("Deformation", 0, -1)
_SQUARE = ("Structure", 0, -2)
_SWIRL = ("Structure", 0, -1)

QUANTITIES: dict[str, Quantity] = {
    entry.name: entry
    for entry in (
        Quantity("u", "u", "Velocity along x", *_VELOCITY, True, ("u",), _component("u")),
        Quantity("v", "v", "Velocity along y", *_VELOCITY, True, ("v",), _component("v")),
        Quantity("w", "w", "Velocity through the plane", *_VELOCITY, True, ("w",), _component("w")),
        Quantity("speed", "|U|", "Speed", *_VELOCITY, False, _PLANE, _speed),
        Quantity("direction", "θ", "Direction", "Velocity", 0, 0, True, _PLANE, _direction, angle=True),
        Quantity("kinetic_energy", "k", "Kinetic energy per mass", *_ENERGY, False, _PLANE, _kinetic_energy),
        Quantity("radial_velocity", "u_r", "Radial velocity", *_VELOCITY, True, _PLANE, _radial),
        Quantity("tangential_velocity", "u_θ", "Tangential velocity", *_VELOCITY, True, _PLANE, _tangential),
        Quantity("vorticity", "ω", "Vorticity", *_RATE, True, _PLANE, _vorticity),
        Quantity("divergence", "∇·u", "Divergence", *_RATE, True, _PLANE, _divergence),
        Quantity("shear_strain_rate", "ε_xy", "Shear strain rate", *_RATE, True, _PLANE, _shear_strain),
        Quantity("normal_strain_rate", "ε_n", "Normal strain rate", *_RATE, True, _PLANE, _normal_strain),
        Quantity(
            "max_strain_rate", "ε_1", "Largest principal strain rate", *_RATE, True, _PLANE, _max_strain
        ),
        Quantity("q_criterion", "Q", "Q criterion", *_SQUARE, True, _PLANE, _q_criterion),
        Quantity("okubo_weiss", "W", "Okubo–Weiss parameter", *_SQUARE, True, _PLANE, _okubo_weiss),
        Quantity(
            "swirling_strength", "λ_ci", "Swirling strength", *_SWIRL, False, _PLANE, _swirling_strength
        ),
    )
}
"""The glossary of quantities, in the order of the panel."""
