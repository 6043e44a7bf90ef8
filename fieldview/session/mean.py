"""The run's mean as a field like any other."""

from __future__ import annotations

from collections.abc import Iterable

from fieldview.compute.field import Field
from fieldview.session.statistics import statistics_of


def mean_of(frames: Iterable[Field]) -> Field:
    """Mean over frames of the measured vectors; filled ones are left out, frames are read one by one.

    The random uncertainty of a node is that of its mean, errors taken as independent from frame to frame;
    it says nothing of how unsteady the flow is. Systematic errors are common to all frames and do not
    average out.
    """
    return statistics_of(frames, lags=1).mean
