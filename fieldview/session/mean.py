"""The run's mean as a field like any other."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.filling import FillMap


def mean_of(frames: Iterable[Field]) -> Field:
    """Mean over frames of the measured vectors; filled ones are left out, frames are read one by one.

    The random uncertainty of a node is that of its mean, root-sum-square of the frames' sigma over their
    number, errors taken as independent from frame to frame; it says nothing of how unsteady the flow is.
    Systematic errors are common to all frames and do not average out.
    """
    totals: dict[str, np.ndarray] = {}
    variances: dict[str, np.ndarray] = {}
    first, last, number, frames_seen, masked = None, None, None, 0, None
    for field in frames:
        if first is None:
            first = field
            number = np.zeros(field.grid.shape, int)
            masked = np.ones(field.grid.shape, bool)
            totals = {name: np.zeros(field.grid.shape) for name in field.components}
            variances = {name: np.zeros(field.grid.shape) for name in field.components}
        last = field
        measured = field.status == Status.MEASURED
        number += measured
        masked &= field.status == Status.MASKED
        frames_seen += 1
        for name, part in field.components.items():
            totals[name] += np.where(measured, part, 0.0)
            sigma = field.error.sigma_of(name, field.grid.shape)
            if sigma is not None:
                variances[name] += np.where(measured, sigma**2, 0.0)
    if first is None:
        raise InputError("the run has no frames to take a mean of")
    some = number > 0
    per_node = np.maximum(number, 1)
    status = np.where(some, Status.MEASURED, np.where(masked, Status.MASKED, Status.MISSING)).astype(np.uint8)
    parts = {name: np.where(some, total / per_node, np.nan) for name, total in totals.items()}
    sigma = None
    if first.error.sigma is not None:
        sigma = {name: np.sqrt(variances[name]) / per_node for name in first.error.sigma if name in parts}
    smoothing = tuple(change for change in last.maps if not isinstance(change, FillMap))
    notes = [*first.notes, f"mean over {frames_seen} frames, noise taken as independent between them"]
    fewest = int(number[some].min()) if some.any() else 0
    if fewest < frames_seen:
        notes.append(f"filled and rejected vectors left out: the fewest frames behind a node are {fewest}")
    return first.with_(
        **parts,
        status=status,
        measured=parts,
        channels={},
        channel_units={},
        time=None,
        maps=smoothing,
        events=(),
        error=replace(first.error, sigma=sigma),
        notes=tuple(notes),
    )
