"""A synthetic run with noise, outliers and gaps, of any size, for benchmarks and the soak of runs."""

from pathlib import Path

import numpy as np

from fieldview.session.models import RunSource, Session, SystematicParts, Uncertainties
from fieldview.session.regions import Circle, Rectangle
from fieldview.session.steps import Fill, MedianTest
from fieldview.session.store import save_session

SPACING, SIGMA = 0.001, 0.02


def velocities(rng: np.random.Generator, nodes: int) -> tuple[np.ndarray, np.ndarray]:
    """Two waves with noise, 3 % outliers and 2 % gaps."""
    axis = np.arange(nodes) * SPACING
    x, y = np.meshgrid(axis, axis)
    flow = np.stack([np.sin(30 * y), np.cos(20 * x)]) + rng.normal(0, SIGMA, (2, nodes, nodes))
    flow[:, rng.random(x.shape) < 0.03] += rng.normal(0, 3.0)
    flow[:, rng.random(x.shape) < 0.02] = np.nan
    return flow[0], flow[1]


def turbid_run(folder: Path, frames: int, nodes: int = 128) -> Path:
    """Write the run and its session: median test, fill, three regions; the session's path."""
    rng, axis = np.random.default_rng(0), np.arange(nodes) * SPACING
    for number in range(frames):
        u, v = velocities(rng, nodes)
        np.savez(folder / f"f{number:05d}.npz", x=axis, y=axis, u=u, v=v)
    width = nodes * SPACING
    session = Session(
        run=RunSource.model_validate(
            {"files": ["f*.npz"], "reading": {"length_unit": "m", "velocity_unit": "m/s"}}
        ),
        error_model=Uncertainties(
            sigma=SIGMA, correlation_nodes=2.0, systematic=SystematicParts(scale=0.003, axis_tilt=0.001)
        ),
        ledger=(MedianTest(floor=SIGMA), Fill()),
        regions=(
            Circle(name="large", centre=(width / 2, width / 2), radius=width / 4),
            Circle(name="small", centre=(width / 3, width / 2), radius=width / 8),
            Rectangle(name="box", corners=((0.2 * width, 0.2 * width), (0.7 * width, 0.6 * width))),
        ),
    )
    path = folder / "turbid.session.json"
    save_session(session.in_folder(folder), path)
    return path
