"""Small runs on disk with a known flow, and sessions on them."""

from pathlib import Path

import numpy as np

from fieldview.session.models import RunSource, Session

X = np.arange(21) * 0.002
Y = np.arange(17) * 0.002
CENTRE = (0.02, 0.016)
GAMMA, CORE = 0.01, 0.005
SIGMA = 0.004


def vortex(x, y, *, centre=CENTRE, gamma=GAMMA, core=CORE):
    """Velocity of a Lamb–Oseen vortex."""
    dx, dy = x - centre[0], y - centre[1]
    r2 = np.maximum(dx**2 + dy**2, 1e-30)
    swirl = gamma / (2 * np.pi * r2) * -np.expm1(-r2 / core**2)
    return -swirl * dy, swirl * dx


def write_frame(path: Path, u, v, *, x=X, y=Y, units=("m", "m/s"), **more) -> None:
    """One frame as comma-separated text, all digits kept; nodes that are NaN are written empty."""
    xx, yy = np.meshgrid(x, y)
    columns = {f"x [{units[0]}]": xx, f"y [{units[0]}]": yy, f"u [{units[1]}]": u, f"v [{units[1]}]": v}
    columns |= more
    rows = zip(*(np.ravel(column) for column in columns.values()), strict=True)
    text = [",".join("" if np.isnan(value) else repr(float(value)) for value in row) for row in rows]
    path.write_text(",".join(columns) + "\n" + "\n".join(text) + "\n")


def vortex_frames(folder: Path, count: int = 1, *, seed: int = 0, sigma: float = SIGMA) -> Session:
    """A run of noisy frames of a vortex that drifts by one node in six frames, and its session."""
    rng = np.random.default_rng(seed)
    folder.mkdir(parents=True, exist_ok=True)
    xx, yy = np.meshgrid(X, Y)
    for number in range(count):
        u, v = vortex(xx, yy, centre=(CENTRE[0] + number * 0.002 / 6, CENTRE[1]))
        u, v = (part + rng.normal(0, sigma, part.shape) for part in (u, v))
        write_frame(folder / f"f{number}.csv", u, v)
    return Session(run=RunSource(files=("f*.csv",))).in_folder(folder)


CIRCLE = {"name": "core", "shape": "circle", "centre": list(CENTRE), "radius": 0.008}
PHASES, FREQUENCY = 8, 2.0


def pulsing_frames(folder: Path, cycles: int = 4) -> Session:
    """A vortex whose strength goes up and down by half twice a second, seen eight times a cycle."""
    rng = np.random.default_rng(1)
    xx, yy = np.meshgrid(X, Y)
    for number in range(cycles * PHASES):
        strength = 1 + 0.5 * np.cos(2 * np.pi * number / PHASES)
        u, v = (strength * part + rng.normal(0, SIGMA, part.shape) for part in vortex(xx, yy))
        crank = np.full(u.shape, 360.0 * number / PHASES)
        write_frame(folder / f"f{number}.csv", u, v, **{"crank [deg]": crank})
    run = {"files": ["f*.csv"], "reading": {"frame_interval": 1 / (PHASES * FREQUENCY)}}
    model = {"sigma": SIGMA, "correlation_nodes": 1, "window": 0}
    return edited(
        Session(run=RunSource(files=("f*.csv",))).in_folder(folder),
        run=run,
        regions=[CIRCLE],
        error_model=model,
    )


def edited(session: Session, **parts) -> Session:
    """The session with some of its keys changed, checked as if read from a file."""
    document = session.model_dump(mode="json", exclude_none=True) | parts
    return Session.model_validate(document).in_folder(session.folder)
