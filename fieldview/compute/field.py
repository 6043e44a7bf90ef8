"""One frame of measured velocities, and what became of every vector."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields, replace
from enum import IntEnum
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.grid import Grid
from fieldview.compute.units import METRIC, Units

if TYPE_CHECKING:
    from fieldview.compute.linear import LinearMap

COMPONENTS = ("u", "v", "w")


class Status(IntEnum):
    """What a node holds. The codes stand in session exports and must not change."""

    MEASURED = 0
    MISSING = 1
    MASKED = 2
    REJECTED = 3
    FILLED = 4


@dataclass(frozen=True, eq=False)
class Event:
    """What one ledger line did to the vectors of one frame.

    Attributes
    ----------
    line : int
        Index of the line in the ledger.
    step : str
        Name of the step, as in the session file.
    action : str
        "rejected", "masked", "filled", "kept", "not judged", "left missing".
    nodes : bool ndarray (ny, nx)
    residual : ndarray (ny, nx) or None
        The figure that was held against ``limit``, where the step has one.
    limit : float or None
    """

    line: int
    step: str
    action: str
    nodes: np.ndarray
    residual: np.ndarray | None = None
    limit: float | None = None


@dataclass(frozen=True, eq=False)
class Field:
    """Velocities of one frame on a grid. Frozen; its arrays cannot be written.

    Attributes
    ----------
    grid : Grid
    u, v, w : ndarray (ny, nx) or None
        Components along the plane's axes and across it; None is absent, not zero. NaN unless the
        node is MEASURED or FILLED. [velocity]
    status : uint8 ndarray (ny, nx)
        Codes of `Status`.
    units : Units
    time : float or None
        Time of the frame in the run. [s]
    measured : mapping of component name to ndarray (ny, nx)
        The values as they came from the file (moved and scaled with the axes), whatever became of
        them since. NaN where the file had none. [velocity]
    channels, channel_units : mappings
        Other measured scalars (ny, nx) by name, and their units as text.
    error : ErrorModel
        How the errors of the measured vectors are taken to behave.
    maps : tuple of LinearMap
        Filling and smoothing, in the order they were applied to the measured values.
    events : tuple of Event
        What each ledger line did.
    derivative : str
        Name of the derivative scheme the session chose.
    notes : tuple of str
        Doubts that belong beside every number taken from this field.
    """

    grid: Grid
    u: np.ndarray | None = None
    v: np.ndarray | None = None
    w: np.ndarray | None = None
    status: np.ndarray | None = None
    units: Units = METRIC
    time: float | None = None
    measured: Mapping[str, np.ndarray] = field(default_factory=dict)
    channels: Mapping[str, np.ndarray] = field(default_factory=dict)
    channel_units: Mapping[str, str] = field(default_factory=dict)
    error: ErrorModel = field(default_factory=ErrorModel)
    maps: tuple[LinearMap, ...] = ()
    events: tuple[Event, ...] = ()
    derivative: str = "central"
    notes: tuple[str, ...] = ()

    def __post_init__(self):
        components = {name: self._array(name) for name in COMPONENTS if getattr(self, name) is not None}
        if not components:
            raise InputError("a field needs at least one velocity component: u, v or w")
        if self.status is None:
            missing = np.zeros(self.grid.shape, bool)
            for values in components.values():
                missing |= ~np.isfinite(values)
            status = np.where(missing, Status.MISSING, Status.MEASURED).astype(np.uint8)
        else:
            status = np.asarray(self.status, np.uint8)
        if not self.measured:
            object.__setattr__(self, "measured", components)
        absent = (status != Status.MEASURED) & (status != Status.FILLED)
        for name, values in components.items():
            if not np.isnan(values[absent]).all():
                values = np.where(absent, np.nan, values)
            object.__setattr__(self, name, _frozen(values))
        object.__setattr__(self, "status", _frozen(status))
        for name in ("measured", "channels"):
            arrays = {key: _frozen(np.asarray(value, float)) for key, value in getattr(self, name).items()}
            object.__setattr__(self, name, MappingProxyType(arrays))

    def __reduce__(self):
        # its read-only mappings cannot be pickled as they are; made anew, it is frozen again
        values = (getattr(self, entry.name) for entry in fields(self))
        return type(self), tuple(dict(v) if isinstance(v, Mapping) else v for v in values)

    def _array(self, name: str) -> np.ndarray:
        values = np.asarray(getattr(self, name), float)
        if values.shape != self.grid.shape:
            raise InputError(f"{name} has shape {values.shape}, the grid {self.grid.shape}; they must agree")
        return values

    @property
    def components(self) -> dict[str, np.ndarray]:
        """The components that are there, by name."""
        return {name: getattr(self, name) for name in COMPONENTS if getattr(self, name) is not None}

    @property
    def in_plane(self) -> bool:
        """Whether both u and v are there."""
        return self.u is not None and self.v is not None

    @property
    def valid(self) -> np.ndarray:
        """bool ndarray (ny, nx): nodes with values, measured or filled."""
        return (self.status == Status.MEASURED) | (self.status == Status.FILLED)

    @property
    def once_rejected(self) -> np.ndarray:
        """bool ndarray (ny, nx): nodes whose vector a line rejected, whatever became of them since."""
        nodes = np.zeros(self.grid.shape, bool)
        for event in self.events:
            if event.action == "rejected":
                nodes |= event.nodes
            elif event.action == "kept":
                nodes &= ~event.nodes
        return nodes

    def count(self, status: Status) -> int:
        return int(np.count_nonzero(self.status == status))

    def with_(self, **changes) -> Field:
        """A copy with these attributes changed."""
        return replace(self, **changes)

    def lattice_components(self) -> dict[str, np.ndarray]:
        """The components along the lattice's own axes (equal to `components` unless axes were turned)."""
        parts = self.components
        if self.grid.placement.is_identity or not self.in_plane:
            return parts
        velocity = self.grid.placement.vector_to_lattice(self.u + 1j * self.v)
        return {**parts, "u": velocity.real, "v": velocity.imag}

    def reject(self, nodes: np.ndarray, event: Event) -> Field:
        """The field with these MEASURED or FILLED nodes rejected, and the event added."""
        return self._set(nodes & self.valid, Status.REJECTED, event)

    def mask(self, nodes: np.ndarray, event: Event) -> Field:
        """The field with these nodes masked, whatever they held, and the event added."""
        return self._set(nodes, Status.MASKED, event)

    def restored(self, nodes: np.ndarray, event: Event) -> Field:
        """The field with these nodes MEASURED again, holding their measured values."""
        parts = {name: np.where(nodes, self.measured[name], part) for name, part in self.components.items()}
        status = np.where(nodes, np.uint8(Status.MEASURED), self.status)
        return self.with_(**parts, status=status, events=(*self.events, event))

    def mapped(self, change: LinearMap, status: np.ndarray) -> Field:
        """The field after a linear map of every component, with the statuses that go with it.

        The map is kept, so that the uncertainty of whatever is computed later passes through it.
        """
        valid = self.valid
        parts = {
            name: np.reshape(change.forward(np.where(valid, part, 0.0).ravel()), part.shape)
            for name, part in self.components.items()
        }
        return self.with_(**parts, status=status, maps=(*self.maps, change))

    def _set(self, nodes, status, event):
        return self.with_(status=np.where(nodes, np.uint8(status), self.status), events=(*self.events, event))


def _frozen(array: np.ndarray) -> np.ndarray:
    if array.flags.writeable:
        array = array.view()
        array.setflags(write=False)
    return array
