"""One vortex in a stirred tank, displacements in pixels with a calibration. Invented; no such tank exists."""

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

PIXEL, PULSE_SEPARATION, NOISE_PIXELS = 0.10e-3, 8e-3, 0.08
NODES, NODE_PIXELS, WINDOW_PIXELS = 61, 16, 32
CORE, CIRCULATION = 0.012, 0.011815
"""Peak speed 0.10 m/s at 1.12091 core radii, 13.45 mm."""

FRAMES, INTERVAL = 5, 0.5
MIDDLE = 488.0
"""Column and row of the middle node, which the calibration makes (0, 0). [px]"""

CENTRE = (0.0021, -0.0013)
"""Centre of the vortex, y upward. [m]"""


def write(folder: Path) -> Path:
    """Write the run and its session."""
    (folder / "run").mkdir()
    for frame in range(FRAMES):
        (folder / "run" / f"tank_{frame}.txt").write_bytes(_frame(frame))
    return save_with_digests(_session(), folder, "stirred_tank")


def _frame(frame: int) -> bytes:
    rng = np.random.default_rng([11, frame])
    places = MIDDLE + (np.arange(NODES) - NODES // 2) * NODE_PIXELS
    column, row = np.meshgrid(places, places)
    x, y = (column - MIDDLE) * PIXEL, -(row - MIDDLE) * PIXEL

    def flow(x, y):
        return vortex(x - CENTRE[0], y - CENTRE[1], circulation=CIRCULATION, core=CORE)

    u, v = seen_through_window(flow, x, y, WINDOW_PIXELS * PIXEL)
    dx, dy = (part * PULSE_SEPARATION / PIXEL for part in (u, -v))  # rows grow downward, and so does dy
    dx, dy = (part + half_overlap_noise(rng, x.shape, NOISE_PIXELS) for part in (dx, dy))
    outlier = rng.random(x.shape) < 0.01
    wrong = rng.uniform(-10, 10, (2, *x.shape))
    dx, dy = np.where(outlier, wrong[0], dx), np.where(outlier, wrong[1], dy)
    columns = {"column [px]": column, "row [px]": row, "dx [px]": dx, "dy [px]": dy}
    return text(columns, (0, 0, 2, 2), delimiter=";", decimal=",")


def _session() -> dict:
    sigma = round(NOISE_PIXELS * PIXEL / PULSE_SEPARATION, 9)
    return {
        "title": "Vortex in a stirred tank, in pixels with a calibration (invented demonstration data)",
        "units": "m, s",
        "run": {
            "files": ["run/tank_*.txt"],
            "reading": {
                "columns": {"x": "column", "y": "row"},
                "y_axis": "down",
                "v_positive": "down",
                "frame_interval": INTERVAL,
            },
        },
        "error_model": {
            "sigma": {"u": sigma, "v": sigma},
            "correlation_nodes": WINDOW_PIXELS / NODE_PIXELS,
            "systematic": {
                "scale": 0.004,
                "pulse_separation": 0.0005,
                "gain": 0.0,
                "axis_tilt": 0.005,
                "zero_offset": 0.0,
            },
            "window": WINDOW_PIXELS * PIXEL,
        },
        "ledger": [
            {
                "step": "calibrate",
                "metres_per_pixel": PIXEL,
                "pulse_separation": PULSE_SEPARATION,
                "origin": [MIDDLE, MIDDLE],
            },
            {"step": "median_test", "radius": 1, "threshold": 2.0},
            {"step": "fill", "method": "harmonic"},
        ],
        "regions": [
            {"name": "vortex", "shape": "circle", "centre": CENTRE, "radius": 0.030},
            {"name": "core", "shape": "circle", "centre": CENTRE, "radius": CORE},
            {
                "name": "oval",
                "shape": "ellipse",
                "centre": CENTRE,
                "semi_axes": [0.040, 0.030],
                "angle_deg": 20,
            },
            {"name": "radius", "shape": "line", "points": [CENTRE, [0.045, CENTRE[1]]]},
        ],
        "reference": {"length": CORE, "velocity": 0.10},
    }  # fmt: skip
