"""Wake of a heaving fin in a water flume, seen by image velocimetry. Invented; no such fin was built.

A fin of 50 mm chord heaves 30 mm peak to peak at 2 Hz in a stream of 0.20 m/s (Reynolds number 10 000,
Strouhal number by the heave 0.30) and sheds a street of vortices that pushes: its upper row turns
counter-clockwise. The street moves at the stream's speed and the speed its own vortices give it,
(Γ/2a) tanh(πh/a) = 0.029 m/s.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

from fieldview.publish.samples.instruments import (
    half_overlap_noise,
    save_with_digests,
    seen_through_window,
    text,
    vortex,
)

STREAM, CONVECTION = 0.20, 0.229
CIRCULATION, CORE = 0.010, 0.009
ROW_DISTANCE = 0.030
FREQUENCY, HEAVE, CHORD, THICKNESS = 2.0, 0.030, 0.050, 0.008
SPACING = CONVECTION / FREQUENCY
"""From vortex to vortex of a row, 115 mm: one leaves in every period of the fin. [m]"""

PIXEL, PULSE_SEPARATION, NOISE_PIXELS, WINDOW = 0.1875e-3, 4e-3, 0.1, 0.006
NODE_SPACING, COLUMNS, ROWS = 0.003, 73, 37
FRAMES, INTERVAL = 48, 0.08
TRAILING_EDGE = 0.012
"""Place of the fin's trailing edge along the stream. [m]"""

SIGMA = NOISE_PIXELS * PIXEL / PULSE_SEPARATION
"""Standard uncertainty of a vector. [m/s]"""

X = np.arange(COLUMNS) * NODE_SPACING
Y = (np.arange(ROWS) - ROWS // 2) * NODE_SPACING
_FIRST_UPPER = 0.100
"""Where an upper vortex stands in frame 0. [m]"""


def write(folder: Path) -> Path:
    """Write the run and its session."""
    (folder / "run").mkdir()
    for frame in range(FRAMES):
        (folder / "run" / f"wake_{frame:02d}.csv").write_bytes(_frame(frame))
    return save_with_digests(_session(), folder, "fin_wake")


def heave(frame: int) -> float:
    """Height of the fin in a frame; an upper vortex leaves when it is highest. [m]"""
    travelled = (_FIRST_UPPER - TRAILING_EDGE) / CONVECTION
    return HEAVE / 2 * np.cos(2 * np.pi * FREQUENCY * (frame * INTERVAL + travelled))


def vortices(frame: int) -> list[tuple[float, float, float]]:
    """(x, y, circulation) of the vortices that have left the fin, eight to a row."""
    found = []
    for row, shift, sign in ((1, 0.0, 1), (-1, SPACING / 2, -1)):
        first = _FIRST_UPPER + shift + CONVECTION * frame * INTERVAL - TRAILING_EDGE
        for number in range(8):
            way = first % SPACING + number * SPACING
            # a vortex gathers its circulation on the first centimetre behind the fin
            strength = sign * CIRCULATION * -np.expm1(-((way / 0.010) ** 2))
            found.append((TRAILING_EDGE + way, row * ROW_DISTANCE / 2, strength))
    return found


def flow(frame: int):
    """The flow of a frame as a function of place."""

    def velocity(x: np.ndarray, y: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        u, v = np.full_like(x, STREAM), np.zeros_like(x)
        for x0, y0, strength in vortices(frame):
            du, dv = vortex(x - x0, y - y0, circulation=strength, core=CORE)
            u, v = u + du, v + dv
        return u, v

    return velocity


def _frame(frame: int) -> bytes:
    rng = np.random.default_rng([7, frame])
    x, y = np.meshgrid(X, Y)
    u, v = seen_through_window(flow(frame), x, y, WINDOW)
    u, v = (part + half_overlap_noise(rng, x.shape, SIGMA) for part in (u, v))
    quality = rng.gamma(9.0, 0.4, x.shape) + 1
    near_fin = (np.abs(y - heave(frame)) < 0.012) & (x < TRAILING_EDGE + 0.006)
    outlier = rng.random(x.shape) < np.where(near_fin, 0.25, 0.015)
    wrong = rng.uniform(-12, 12, (2, *x.shape)) * PIXEL / PULSE_SEPARATION
    u, v = np.where(outlier, wrong[0], u), np.where(outlier, wrong[1], v)
    quality = np.where(outlier, rng.uniform(1.0, 1.5, x.shape), quality)
    missing = rng.random(x.shape) < 0.006
    # now and then a bubble hides two by two nodes
    for _ in range(3):
        iy, ix = rng.integers(0, ROWS - 1), rng.integers(0, COLUMNS - 1)
        missing[iy : iy + 2, ix : ix + 2] = True
    u, v, quality = (np.where(missing, np.nan, part) for part in (u, v, quality))
    columns = {
        "x [mm]": 1e3 * x,
        "y [mm]": 1e3 * y,
        "Vx [mm/s]": 1e3 * u,
        "Vy [mm/s]": 1e3 * v,
        "peak ratio": quality,
    }
    return text(columns, (0, 0, 1, 1, 1))


def _session() -> dict:
    fin = [
        [TRAILING_EDGE - CHORD, -THICKNESS / 2 - 0.002],
        [TRAILING_EDGE + 0.003, -0.004],
        [TRAILING_EDGE + 0.003, 0.004],
        [TRAILING_EDGE - CHORD, THICKNESS / 2 + 0.002],
    ]
    motion = [[frame, 0.0, round(heave(frame), 6), 0.0] for frame in range(FRAMES)]
    return {
        "title": "Wake of a heaving fin in a water flume (invented demonstration data)",
        "units": "m, s",
        "run": {
            "files": ["run/wake_*.csv"],
            "reading": {"y_axis": "up", "v_positive": "up", "frame_interval": INTERVAL},
        },
        "error_model": {
            "sigma": {"u": round(SIGMA, 6), "v": round(SIGMA, 6)},
            "correlation_nodes": 2,
            "systematic": {
                "scale": 0.003,
                "pulse_separation": 0.001,
                "gain": 0.0,
                "axis_tilt": 0.005,
                "zero_offset": 0.0,
            },
            "window": WINDOW,
        },
        "ledger": [
            {"step": "mask", "region": {"shape": "polygon", "points": fin}, "motion": motion},
            {"step": "median_test", "radius": 1, "threshold": 2.0, "passes": 2},
            {"step": "fill", "method": "linear", "max_gap": 4},
        ],
        "regions": [
            {"name": "upper vortex", "shape": "circle", "centre": [_FIRST_UPPER, 0.015], "radius": 0.020},
            {
                "name": "lower vortex",
                "shape": "circle",
                "centre": [round(_FIRST_UPPER + SPACING / 2, 5), -0.015],
                "radius": 0.020,
            },
            {"name": "one pair", "shape": "rectangle", "corners": [[0.070, -0.045], [0.185, 0.045]]},
            {"name": "wake cut", "shape": "line", "points": [[0.195, 0.048], [0.195, -0.048]]},
        ],
        "reference": {
            "length": CHORD, "length_name": "chord", "u_length": 0.0001,
            "velocity": STREAM, "u_velocity": 0.002,
        },
        "phase": {"frequency": FREQUENCY, "u_frequency": 0.002},
    }  # fmt: skip
