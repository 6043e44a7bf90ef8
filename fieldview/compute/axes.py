"""Changes of axes and of the observer: calibration, turned axes, moving frames."""

from __future__ import annotations

import cmath
from dataclasses import replace

import numpy as np

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid, Placement
from fieldview.compute.linear import MeanRemoval
from fieldview.compute.units import METRIC, PIXEL


def calibrate(
    field: Field,
    *,
    metres_per_pixel: float | tuple[float, float],
    pulse_separation: float,
    origin: tuple[float, float] = (0.0, 0.0),
) -> Field:
    """The field in metres and seconds.

    The error model the field has by now is converted alike.

    Parameters
    ----------
    field : Field
        In pixels and pulses, its lattice along the plane's axes.
    metres_per_pixel : float or (float, float)
        One scale, or one along x and one along y. [m/px]
    pulse_separation : float
        [s]
    origin : (float, float)
        The pixel that becomes (0, 0). [px]

    Raises
    ------
    InputError
        The field is in metres already, a scale or the separation is not positive, or the axes were
        turned before.
    """
    scale = np.broadcast_to(np.asarray(metres_per_pixel, float), (2,))
    if field.units != PIXEL:
        raise InputError("the vectors are in metres and seconds already; remove the calibration")
    if not (scale > 0).all() or not pulse_separation > 0:
        raise InputError(
            f"metres_per_pixel is {metres_per_pixel} and pulse_separation is {pulse_separation}; "
            "give positive numbers"
        )
    if not field.grid.placement.is_identity:
        raise InputError("the calibration must come before the axes are turned; move it up in the ledger")
    grid = Grid((field.grid.x - origin[0]) * scale[0], (field.grid.y - origin[1]) * scale[1])
    # the velocity across the plane has no pixel scale of its own; the mean of the two is the best there is
    factors = {"u": scale[0], "v": scale[1], "w": float(np.sqrt(scale[0] * scale[1]))}
    factors = {name: float(factor / pulse_separation) for name, factor in factors.items()}
    return field.with_(
        grid=grid,
        units=METRIC,
        measured={name: part * factors[name] for name, part in field.measured.items()},
        error=_scaled(field.error, scale, factors),
        **{name: part * factors[name] for name, part in field.components.items()},
    )


def turn_axes(
    field: Field,
    *,
    angle: float = 0.0,
    about: complex = 0j,
    reflect: str | None = None,
    shift: complex = 0j,
) -> Field:
    """The field in new axes, turned, reflected and shifted. The measured lattice stays where it is.

    Parameters
    ----------
    field : Field
        With both u and v, unless the axes are only shifted.
    angle : float
        Turn of the axes, counter-clockwise; a fixed vector then reads turned by ``-angle``. [rad]
    about : complex
        Point x + iy about which the axes turn and are reflected. [length]
    reflect : "x", "y" or None
        Axis whose direction is reversed, after the turn.
    shift : complex
        Added to the coordinates last. [length]

    Raises
    ------
    InputError
        Only one of u and v is there, and the turn would mix them; or ``reflect`` is something else.
    """
    if reflect not in (None, "x", "y"):
        raise InputError(f'reflect is "{reflect}"; write "x", "y" or null')
    placement = field.grid.placement.then(turn=angle, about=about, reflect=reflect, shift=shift)
    grid = Grid(field.grid.x, field.grid.y, placement)
    change = Placement().then(turn=angle, reflect=reflect)
    if change.is_identity or (field.u is None and field.v is None):
        return field.with_(grid=grid)
    if not field.in_plane:
        raise InputError("axes can only be turned or reflected where both u and v are there")
    return field.with_(
        grid=grid,
        measured={**field.measured, **_turned(field.measured, change)},
        error=_turned_error(field.error, angle, reflect),
        **_turned(field.components, change),
    )


def moving_frame(
    field: Field, *, velocity: complex = 0j, rotation: float = 0.0, about: complex = 0j
) -> Field:
    """The velocities seen by an observer who moves and turns, in the axes of this instant.

    Parameters
    ----------
    velocity : complex
        Velocity of the observer, u + iv, subtracted. [velocity]
    rotation : float
        Rotation rate of the observer, counter-clockwise. [rad/time]
    about : complex
        Centre of that rotation, x + iy. [length]
    """
    carried = velocity + 1j * rotation * (field.grid.nodes - about)
    return _without(field, {"u": carried.real, "v": carried.imag})


def remove_mean(field: Field) -> Field:
    """The field without the mean u and v of its valid vectors; w is left as it is.

    The mean is made of the same vectors, so its own random error is followed as the linear map it is.
    """
    valid = field.valid
    if not valid.any():
        raise InputError("there is no valid vector to take a mean of")
    means = {name: float(part[valid].mean()) for name, part in field.components.items() if name != "w"}
    share = np.where(valid, 1.0 / np.count_nonzero(valid), 0.0).ravel()
    after = _without(field, means)
    return after.with_(maps=(*field.maps, MeanRemoval(share)))


def _without(field: Field, carried: dict) -> Field:
    def subtracted(parts):
        return {name: part - carried[name] if name in carried else part for name, part in parts.items()}

    return field.with_(measured=subtracted(field.measured), **subtracted(field.components))


def _turned(parts, change: Placement) -> dict[str, np.ndarray]:
    velocity = change.vector_to_plane(parts["u"] + 1j * parts["v"])
    return {"u": velocity.real, "v": velocity.imag}


def _scaled(error: ErrorModel, scale, factors: dict[str, float]) -> ErrorModel:
    if error.sigma is not None:
        sigma = {name: np.asarray(value, float) * factors[name] for name, value in error.sigma.items()}
        error = replace(error, sigma=sigma)
    if error.window is not None:
        error = replace(error, window=(error.window[0] * scale[0], error.window[1] * scale[1]))
    if error.systematic.zero_offset is not None:
        offset = error.systematic.zero_offset * factors["w"]
        error = replace(error, systematic=replace(error.systematic, zero_offset=offset))
    return error


def _turned_error(error: ErrorModel, angle: float, reflect: str | None) -> ErrorModel:
    """The errors stay independent along the axes they were stated for; the turn back to them is kept."""
    turn = error.turn * cmath.exp(1j * angle)
    return replace(error, turn=turn.conjugate() if reflect else turn)
