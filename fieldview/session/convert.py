"""Setting a calibration: every number of the session moves along with the field in one edit."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from pydantic import BaseModel

from fieldview.compute.grid import Placement
from fieldview.compute.quantities import QUANTITIES
from fieldview.session import regions
from fieldview.session.models import Session
from fieldview.session.steps import Calibrate, TurnAxes


def set_calibration(session: Session, step: Calibrate | None) -> Session:
    """The session with this calibration (None removes it), all its numbers converted.

    Contours stay where they are on the field: a point that was a certain pixel is that pixel still. Where
    x and y change by different factors a circle becomes an ellipse, or under turned axes the polygon
    that stands for it; single lengths take the geometric mean of the two factors.
    """
    before, others = _calibration(session), [s for s in session.ledger if not isinstance(s, Calibrate)]
    change = _Change.between(session, before, step)
    ledger = ([step] if step is not None else []) + [_converted(entry, change) for entry in others]
    return session.model_copy(
        update={
            "units": "m, s" if step is not None and step.on else "px, pulse",
            "ledger": tuple(ledger),
            "regions": tuple(_moved_region(region, change) for region in session.regions),
            "error_model": _error_model(session, change),
            "reference": _converted(session.reference, change),
            "figures": tuple(_figure(figure, change) for figure in session.figures),
        }
    )


def _figure(figure, change: _Change):
    """A figure with its probe and the ends of its colours in the new units."""
    entry = QUANTITIES.get(figure.quantities[0])
    factor = 1.0 if entry is None else change.length**entry.length * change.time**entry.time
    ends = {
        name: None if (end := getattr(figure, name)) is None else end * factor for name in ("low", "high")
    }
    return _converted(figure, change).model_copy(update=ends)


def _calibration(session: Session) -> Calibrate | None:
    return next((step for step in session.ledger if isinstance(step, Calibrate)), None)


@dataclass(frozen=True)
class _Change:
    """From old to new units: factors of length along the lattice's x and y, of time, and of places."""

    x: float
    y: float
    time: float
    old: tuple[complex, complex]  # scale (x + iy) and origin before, and after the change
    new: tuple[complex, complex]
    old_axes: Placement
    new_axes: Placement

    @classmethod
    def between(cls, session: Session, before: Calibrate | None, after: Calibrate | None) -> _Change:
        old_scale, old_time, old_origin = _numbers(before, session)
        new_scale, new_time, new_origin = _numbers(after, session)
        turn = next((s for s in session.ledger if isinstance(s, TurnAxes) and s.on), None)
        change = cls(
            new_scale.real / old_scale.real,
            new_scale.imag / old_scale.imag,
            new_time / old_time,
            (old_scale, old_origin),
            (new_scale, new_origin),
            Placement(),
            Placement(),
        )
        if turn is None:
            return change
        return cls(
            **{**change.__dict__, "old_axes": _axes(turn), "new_axes": _axes(_converted(turn, change))}
        )

    @property
    def length(self) -> float:
        return (self.x * self.y) ** 0.5

    @property
    def is_even(self) -> bool:
        return abs(self.x - self.y) <= 1e-12 * abs(self.x)

    def lattice_point(self, point):
        """A point in lattice coordinates, complex, in the new units."""
        scale, origin = self.old
        pixel = complex(point.real / scale.real, point.imag / scale.imag) + origin
        scale, origin = self.new
        moved = pixel - origin
        return complex(moved.real * scale.real, moved.imag * scale.imag)

    def point(self, point) -> tuple[float, float]:
        """A point in the plane, in the new units."""
        z = self.new_axes.to_plane(self.lattice_point(self.old_axes.to_lattice(complex(*point))))
        return (float(z.real), float(z.imag))

    def vector(self, extent, factor: float = 1.0) -> tuple[float, float]:
        """A shift or velocity in the plane; ``factor`` holds the power of time."""
        z = self.old_axes.vector_to_lattice(complex(*extent))
        z = self.new_axes.vector_to_plane(complex(z.real * self.x, z.imag * self.y) * factor)
        return (float(z.real), float(z.imag))


def _numbers(step: Calibrate | None, session: Session) -> tuple[complex, float, complex]:
    if step is None or not step.on:
        return 1 + 1j, 1.0, 0j
    column, row = step.origin
    if session.run.reading.y_axis == "down":
        row = -row
    return complex(*step.scale), step.pulse_separation, complex(column, row)


def _axes(turn: TurnAxes) -> Placement:
    return Placement().then(
        turn=np.radians(turn.angle_deg),
        about=complex(*turn.about),
        reflect=turn.reflect,
        shift=complex(*turn.shift),
    )


_CONVERT: dict[str, Callable] = {
    "point": lambda change, value: change.point(value),
    "points": lambda change, value: tuple(change.point(point) for point in value),
    "length": lambda change, value: value * change.length,
    "lengths": lambda change, value: (value[0] * change.x, value[1] * change.y),
    "velocity": lambda change, value: value * change.length / change.time,
    "velocities": lambda change, value: change.vector(value, 1 / change.time),
    "component limits": lambda change, value: tuple(
        None if limit is None else limit * change.length / change.time for limit in value
    ),
    "rate": lambda change, value: value / change.time,
    "motion": lambda change, value: tuple(
        (frame, *change.vector((dx, dy)), angle) for frame, dx, dy, angle in value
    ),
}


def _converted(model: BaseModel, change: _Change):
    """A model with every number that has a dimension in the new units, parts of it too."""
    update = {}
    for name, info in type(model).model_fields.items():
        value = getattr(model, name)
        kind = (info.json_schema_extra or {}).get("quantity")
        if isinstance(model, TurnAxes) and kind == "point":
            z = change.lattice_point(complex(*value))
            update[name] = (z.real, z.imag)
        elif value is not None and kind in _CONVERT:
            update[name] = _CONVERT[kind](change, value)
        elif name == "region" and value is not None:
            update[name] = _moved_region(value, change)
    return model.model_copy(update=update)


def _moved_region(region, change: _Change):
    if change.is_even or (not hasattr(region, "radius") and not hasattr(region, "semi_axes")):
        return _converted(region, change)
    return _uneven(region, change)


def _uneven(region, change: _Change):
    """A circle or ellipse after different factors along x and y."""
    named = {key: getattr(region, key) for key in ("name", "colour") if hasattr(region, key)}
    outline = region.outline()
    if change.old_axes.is_identity and outline.angle == 0:
        a, b = outline.semi_axes
        kind = regions.Ellipse if named else regions.EllipseShape
        return kind(centre=change.point(outline.centre), semi_axes=(a * change.x, b * change.y), **named)
    kind = regions.Polygon if named else regions.PolygonShape
    corners = tuple(change.point((z.real, z.imag)) for z in outline.vertices)
    return kind(points=corners, **named)


def _error_model(session: Session, change: _Change):
    model = session.error_model
    sigma = model.sigma
    if isinstance(sigma, dict):
        factors = {"u": change.x, "v": change.y, "w": change.length}
        sigma = {name: value * factors[name] / change.time for name, value in sigma.items()}
    elif isinstance(sigma, float) and change.is_even:
        sigma = sigma * change.x / change.time
    elif isinstance(sigma, float):
        # one number no longer serves both components
        sigma = {"u": sigma * change.x / change.time, "v": sigma * change.y / change.time}
    window = model.window
    if isinstance(window, float) and not change.is_even:
        window = (window, window)
    if window is not None:
        window = (
            window * change.x if isinstance(window, float) else (window[0] * change.x, window[1] * change.y)
        )
    systematic = _converted(model.systematic, change)
    return model.model_copy(update={"sigma": sigma, "window": window, "systematic": systematic})
