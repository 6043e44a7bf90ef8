"""Modes and two-point correlations of a session's run, after its ledger."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass

import numpy as np

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid
from fieldview.compute.modes import Modes, decompose
from fieldview.compute.two_point import IntegralLength, TwoPoint, integral_length
from fieldview.files import UnreadableFrame
from fieldview.session.statistics import frame_numbers
from fieldview.session.wording import figure

MOST_BYTES = 1_000_000_000
"""Of snapshots held in memory at once; the method needs them all."""


@dataclass(frozen=True, eq=False)
class RunModes:
    """Modes of a run and the frames they were made from.

    Attributes
    ----------
    modes : Modes
    frames : int ndarray (N,)
    times : ndarray (N,)
        NaN where not known. [s]
    first : Field
        The first frame, for grid, units and error model.
    unread : tuple of str
        A sentence for every frame that could not be read and takes no part.
    """

    modes: Modes
    frames: np.ndarray
    times: np.ndarray
    first: Field
    unread: tuple[str, ...] = ()

    def mean_field(self) -> Field:
        """The mean that the modes are about, as a frame."""
        parts = dict(zip(self.modes.names, self.modes.mean, strict=True))
        return self._made(parts, None, f"mean of {len(self.frames)} frames, gaps filled by modes")

    def mode_field(self, number: int) -> Field:
        """One mode, counted from 1, as a frame: its values as large as its root mean square in the run."""
        found = self.modes
        if not 1 <= number <= len(found.modes):
            raise InputError(f"mode {number} does not exist; the modes are 1 to {len(found.modes)}")
        strength = float(np.sqrt(found.energies[number - 1]))
        parts = dict(zip(found.names, strength * found.modes[number - 1], strict=True))
        share = (
            f"mode {number} with {figure(100 * found.shares[number - 1], 3)} % of the fluctuation's energy"
        )
        return self._made(parts, None, share)

    def reconstruction(self, frame: int, *, count: int | None = None) -> Field:
        """A frame of the run from the mean and its first modes."""
        place = np.flatnonzero(self.frames == frame)
        if not place.size:
            raise InputError(f"frame {frame} is not among those the modes were made from")
        parts = self.modes.reconstruction(int(place[0]), count=count)
        kept = len(self.modes.modes) if count is None else min(count, len(self.modes.modes))
        time = self.times[place[0]]
        share = figure(100 * self.modes.shares[:kept].sum(), 3)
        note = f"frame {frame} from the mean and {kept} modes, {share} % of the energy"
        return self._made(parts, None if np.isnan(time) else float(time), note)

    def rows(self) -> list[dict]:
        """One row for every mode kept, in strict JSON."""
        found = self.modes
        scatter = found.energy_uncertainty(len(self.frames))
        unit = self.first.units.of(2, -2)
        return [
            {
                "mode": place + 1,
                "energy": {
                    "value": float(found.energies[place]),
                    "unit": unit,
                    "uncertainty": float(scatter[place]),
                },
                "share": float(found.shares[place]),
                "cumulative": float(found.shares[: place + 1].sum()),
                "apart": self._apart(place, scatter),
            }
            for place in range(len(found.modes))
        ]

    def remarks(self) -> list[str]:
        found = self.modes
        independent = "uncertainties of energies take the frames as independent: a lower bound otherwise"
        said = [*self.unread, independent]
        if found.gap_share:
            share = figure(100 * found.gap_share, 3)
            said.append(f"{share} % of the vectors were missing and filled with {found.gap_modes} modes")
        if not found.settled:
            said.append("the filling of the gaps did not come to rest")
        left = int(found.nodes.size - found.nodes.sum())
        if left:
            said.append(f"{left} nodes are measured too seldom and take no part")
        return said

    def _apart(self, place: int, scatter: np.ndarray) -> bool:
        """Whether a mode's energy is clear of its neighbours'; if not they are mixed with each other."""
        energies = self.modes.energies
        gaps = np.abs(np.diff(energies[max(0, place - 1) : place + 2]))
        return bool((gaps > scatter[place]).all())

    def _made(self, parts, time, note) -> Field:
        return self.first.with_(
            **parts,
            status=np.where(self.modes.nodes, np.uint8(Status.MEASURED), np.uint8(Status.MISSING)),
            measured=parts,
            channels={},
            channel_units={},
            time=time,
            maps=(),
            events=(),
            error=ErrorModel(),
            notes=(note, "no uncertainty is known of what is made of modes"),
        )


def run_modes(
    bench,
    frames: Iterable[int] | str | None = None,
    *,
    count: int = 10,
    gap_modes: int | None = None,
    filled: bool = False,
    on_frame: Callable[[int], None] | None = None,
) -> RunModes:
    """Modes of chosen frames; filled vectors are gaps unless asked otherwise.

    Raises
    ------
    InputError
        The frames do not fit into memory together, or are too few.
    """
    numbers = frame_numbers(bench, frames)
    first, stacks, times = None, {}, np.full(len(numbers), np.nan)
    used, unread = [], []
    for number in numbers:
        place = len(used)
        try:
            field = bench.field(number)
        except UnreadableFrame as error:
            unread.append(f"frame {number} was skipped: {error}")
            if len(unread) == len(numbers):
                raise
            continue
        used.append(number)
        if first is None:
            first = field
            size = len(numbers) * field.status.size * len(field.components) * 8
            if size > MOST_BYTES:
                most = int(len(numbers) * MOST_BYTES / size)
                raise InputError(
                    f"{len(numbers)} frames of this size do not fit into memory for modes; choose at most "
                    f"{most}, such as every {-(-len(numbers) // most)}th"
                )
            stacks = {name: np.empty((len(numbers), *field.grid.shape)) for name in field.components}
        wanted = field.valid if filled else field.status == Status.MEASURED
        for name, part in field.components.items():
            stacks[name][place] = np.where(wanted, part, np.nan)
        times[place] = np.nan if field.time is None else field.time
        if on_frame is not None:
            on_frame(number)
    if first is None:
        raise InputError("the run has no frames to find modes of")
    stacks = {name: stack[: len(used)] for name, stack in stacks.items()}
    modes = decompose(stacks, count=count, weights=node_areas(first.grid), gap_modes=gap_modes)
    return RunModes(modes, np.array(used), times[: len(used)], first, tuple(unread))


def node_areas(grid: Grid) -> np.ndarray:
    """Area that each node stands for (ny, nx), half as wide at the edges. [length^2]"""
    widths = [np.gradient(axis) if axis.size > 1 else np.ones(1) for axis in (grid.y, grid.x)]
    for axis, width in zip((grid.y, grid.x), widths, strict=True):
        if axis.size > 2:
            width[1:-1] = 0.5 * (axis[2:] - axis[:-2])
        width[[0, -1]] *= 0.5 if axis.size > 1 else 1.0
    return widths[0][:, None] * widths[1]


def two_point(
    bench,
    point: tuple[float, float],
    first: str = "u",
    second: str | None = None,
    frames: Iterable[int] | str | None = None,
    *,
    on_frame: Callable[[int], None] | None = None,
) -> tuple[TwoPoint, dict[str, IntegralLength], Grid]:
    """Correlation of a component at the node nearest to a point with one at every node.

    Measured vectors alone count.

    Returns
    -------
    TwoPoint
    dict
        Integral length along "+x", "-x", "+y" and "-y" of the lattice. [length]
    Grid
    """
    found, grid = None, None
    for number in frame_numbers(bench, frames):
        field = bench.field(number)
        if found is None:
            grid = field.grid
            place = np.unravel_index(np.argmin(np.abs(grid.nodes - complex(*point))), grid.shape)
            found = TwoPoint((int(place[0]), int(place[1])), grid.shape)
        parts = {}
        for name in {first, second or first}:
            if name not in field.components:
                raise InputError(f"the run has no component {name}; it has: {', '.join(field.components)}")
            parts[name] = np.where(field.status == Status.MEASURED, field.components[name], np.nan)
        found.add(parts[first], parts[second or first])
        if on_frame is not None:
            on_frame(number)
    if found is None:
        raise InputError("the run has no frames to correlate")
    rho, spread = found.coefficient(), found.uncertainty()
    lengths = {
        along: integral_length(rho, spread, grid, found.node, along=along)
        for along in ("+x", "-x", "+y", "-y")
    }
    return found, lengths, grid
