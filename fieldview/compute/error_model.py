"""How the errors of the measured vectors are taken to behave."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from types import MappingProxyType

import numpy as np


@dataclass(frozen=True)
class Systematic:
    """Standard uncertainties of errors common to every vector of the run; None was not stated.

    Attributes
    ----------
    scale : float or None
        Relative, of the length scale of calibrated image data. [1]
    pulse_separation : float or None
        Relative. [1]
    gain : float or None
        Relative velocity error common to all points, such as a probe's calibration. [1]
    axis_tilt : float or None
        Angle between the assumed and the true axes. [rad]
    zero_offset : float or None
        Velocity error common to all points, per component. [velocity]
    """

    scale: float | None = None
    pulse_separation: float | None = None
    gain: float | None = None
    axis_tilt: float | None = None
    zero_offset: float | None = None


@dataclass(frozen=True, eq=False)
class ErrorModel:
    """Random and systematic errors of a field.

    Attributes
    ----------
    sigma : mapping of component name to float or ndarray (ny, nx), or None
        Standard uncertainty of each measured vector; None is unknown. [velocity]
    origin : str
        "given", "from file", "estimated" or "not stated": where ``sigma`` comes from.
    correlation : (float, float)
        Nodes along x and y over which errors are correlated: window size over spacing, real-valued.
        The correlation coefficient is a separable triangle, rho(k) = max(0, 1 - |k|/m) per axis.
    correlation_stated : bool
        False where 1 was used because nothing was said: random uncertainty is then a lower bound.
    systematic : Systematic
    window : (float, float) or None
        Size of the measuring window along x and y; (0, 0) is a point probe. [length]
    turn : complex
        Unit factor e^{i a}: multiplying plane components u + iv by it gives the components whose errors
        are independent (1 unless sigma came with the file and the axes were turned since).
    """

    sigma: Mapping[str, float | np.ndarray] | None = None
    origin: str = "not stated"
    correlation: tuple[float, float] = (1.0, 1.0)
    correlation_stated: bool = False
    systematic: Systematic = field(default_factory=Systematic)
    window: tuple[float, float] | None = None
    turn: complex = 1 + 0j

    def __post_init__(self):
        if self.sigma is not None:
            object.__setattr__(self, "sigma", MappingProxyType(dict(self.sigma)))

    def __reduce__(self):
        # its read-only mappings cannot be pickled as they are; made anew, it is frozen again
        values = (getattr(self, entry.name) for entry in fields(self))
        return type(self), tuple(dict(v) if isinstance(v, Mapping) else v for v in values)

    def sigma_of(self, component: str, shape: tuple[int, int]) -> np.ndarray | None:
        """Standard uncertainty of one component at every node, ndarray (ny, nx), or None if unknown."""
        if self.sigma is None or component not in self.sigma:
            return None
        return np.broadcast_to(np.asarray(self.sigma[component], float), shape)
