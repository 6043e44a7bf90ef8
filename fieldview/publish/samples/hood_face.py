"""Anemometer traverse across the open face of a hood. Invented; no such hood was measured.

Nine columns at the middles of equal areas, seven rows by the log-Tchebycheff rule, one component through the
plane. The instrument's own uncertainty, 0.02 m/s and 3 % (k = 2), is common to all points.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

from fieldview.publish.samples.instruments import save_with_digests, text

WIDTH, HEIGHT = 1.20, 0.50
FLOW = 0.300
"""Through the whole face: 0.50 m/s on 0.60 m². [m^3/s]"""

TURBULENCE, SAMPLES_PER_POINT = 0.12, 60
OFFSET, GAIN = 0.02 / 2, 0.03 / 2
"""Standard uncertainties of the instrument. [m/s], [1]"""

ROWS_SHARE = np.array([0.053, 0.203, 0.366, 0.500, 0.634, 0.797, 0.947])
"""Log-Tchebycheff positions for seven points a side (ISO 3966, table)."""

X = (np.arange(9) + 0.5) / 9 * WIDTH
Y = ROWS_SHARE * HEIGHT


def write(folder: Path) -> Path:
    """Write the traverse and its session."""
    rng = np.random.default_rng(13)
    x, y = np.meshgrid(X, Y)
    sigma = TURBULENCE * face_velocity(x, y) / np.sqrt(SAMPLES_PER_POINT)
    w = face_velocity(x, y) + rng.normal(size=x.shape) * sigma
    w = w * (1 + GAIN * rng.normal()) + OFFSET * rng.normal()
    columns = {"x [m]": x, "y [m]": y, "w [m/s]": w, "sigma_w [m/s]": sigma}
    (folder / "hood_face.csv").write_bytes(text(columns, (4, 4, 3, 4)))
    return save_with_digests(_session(), folder, "hood_face")


def face_velocity(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Velocity into the hood: faster in the middle and towards the bottom, 0.50 m/s in the mean."""
    across = 1 + 0.06 * np.cos(2 * np.pi * (x / WIDTH - 0.5))
    upward = 1 - 0.08 * (2 * y / HEIGHT - 1)
    return FLOW / (WIDTH * HEIGHT) * across * upward


def _session() -> dict:
    return {
        "title": "Velocity across the face of a hood, 9 x 7 points (invented demonstration data)",
        "units": "m, s",
        "run": {"files": ["hood_face.csv"], "reading": {"y_axis": "up"}},
        "error_model": {
            "sigma": "from file",
            "correlation_nodes": 1,
            "systematic": {
                "scale": 0.001,
                "pulse_separation": 0.0,
                "gain": GAIN,
                "axis_tilt": 0.0,
                "zero_offset": OFFSET,
            },
            "window": 0,
        },
        "regions": [
            {
                "name": "between the outer points",
                "shape": "rectangle",
                "corners": [[round(X[0], 4), round(Y[0], 4)], [round(X[-1], 4), round(Y[-1], 4)]],
            },
            {
                "name": "left half",
                "shape": "rectangle",
                "corners": [[round(X[0], 4), round(Y[0], 4)], [WIDTH / 2, round(Y[-1], 4)]],
            },
        ],
        "reference": {"length": HEIGHT, "velocity": 0.5},
    }  # fmt: skip
