"""A run: an ordered, lazily read sequence of frames on one grid."""

from __future__ import annotations

import hashlib
import os
import threading
from bisect import bisect_right
from collections import OrderedDict
from collections.abc import Iterable
from functools import cached_property
from itertools import accumulate
from pathlib import Path
from typing import TYPE_CHECKING

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.units import Units
from fieldview.files.arrangement import Rows
from fieldview.files.formats import read_contents
from fieldview.files.frames import Layout, frame_of, lay_out
from fieldview.files.reading import Reading
from fieldview.files.sources import expand

if TYPE_CHECKING:
    from fieldview.files.stored import StoredRun

KEPT_FRAMES = 4
"""Frames kept once read; the replay above has a cache of its own."""

KEPT_FILES = 2
"""Files of several frames kept open."""


def open_run(
    patterns: Iterable[str | Path],
    reading: Reading | None = None,
    *,
    folder: Path | str = ".",
    store: str | Path | None = None,
) -> Run | StoredRun:
    """The run in these files, read as ``reading`` says where they do not say it themselves.

    Only the first file is read at once, and the heads of the others where files hold several frames. With a
    run ``store`` (relative to the folder) that still fits the files, frames come from it.

    Raises
    ------
    NeedsAnswer
        The first file does not say something that must be known.
    InputError
        No file is there, or the first cannot be read.
    """
    sources, reading, note = tuple(expand(patterns, folder)), reading or Reading(), None
    if store is not None:
        from fieldview.files.stored import StoredRun, why_unfit

        path = Path(folder) / store
        why = why_unfit(path, sources, reading, Path(folder))
        if why is None:
            return StoredRun(path, sources, folder=Path(folder))
        note = f"the run store {store} is not used: {why}; make it anew with loopflux store"
    run = Run(sources, reading, folder=folder)
    run.notes = (*run.notes, note) if note else run.notes
    return run


def name_within(source: Path, folder: Path) -> str:
    """A source's path relative to the run's folder."""
    return Path(os.path.relpath(source, folder)).as_posix()


def digest_of(source: Path) -> str:
    """sha256 of a file. InputError where it cannot be read."""
    try:
        with source.open("rb") as stream:
            return "sha256:" + hashlib.file_digest(stream, "sha256").hexdigest()
    except OSError as error:
        raise InputError(f"{source}: cannot be read ({error.strerror}); check the path") from None


class UnreadableFrame(InputError):
    """One frame's file cannot be read or does not fit the run; the other frames may be sound."""


class Run:
    """Frames of one run, read when they are asked for; safe to use from several threads.

    Attributes
    ----------
    sources : tuple of Path
    reading : Reading
    units : Units
    grid : Grid
        That of the first frame; every frame is placed on it.
    notes : tuple of str
        What was assumed and dropped on reading the first frame.
    times : tuple of float or None
        Time of each frame as far as it is known without reading it. [s]
    """

    def __init__(self, sources: Iterable[Path], reading: Reading, *, folder: Path | str = "."):
        self.sources = tuple(sources)
        self.reading = reading
        self._folder = Path(folder)
        self._lock = threading.RLock()
        self._layouts: OrderedDict[int, Layout] = OrderedDict()
        self._fields: OrderedDict[int, Field] = OrderedDict()
        first = self._layout(0)
        self.units: Units = first.scales.units
        self._first_frames = first.frames
        field, dropped = frame_of(first, 0)
        self._fields[0] = self._timed(field, 0)
        self.notes = (*first.notes, *dropped)
        self.grid: Grid = field.grid

    @cached_property
    def _ends(self) -> list[int]:
        """Number of frames up to the end of each file."""
        with self._lock:
            if self._first_frames == 1:
                # one frame a file: the others are not opened to count them
                return list(range(1, len(self.sources) + 1))
            return list(accumulate(self._layout(number).frames for number in range(len(self.sources))))

    def __len__(self) -> int:
        return self._ends[-1]

    def __getitem__(self, frame: int) -> Field:
        """One frame in the program's units. UnreadableFrame where its file is bad or has another grid."""
        if not 0 <= frame < len(self):
            raise IndexError(f"frame {frame} of {len(self)}")
        with self._lock:
            known = self._fields.get(frame)
            if known is None:
                try:
                    known = self._read(frame)
                except InputError as error:
                    raise UnreadableFrame(str(error)) from None
                self._fields[frame] = known
                while len(self._fields) > KEPT_FRAMES:
                    self._fields.popitem(last=False)
            else:
                self._fields.move_to_end(frame)
            return known

    @cached_property
    def times(self) -> tuple[float | None, ...]:
        interval = self.reading.frame_interval
        if interval is not None:
            return tuple(number * interval for number in range(len(self)))
        if self._first_frames == 1 and len(self.sources) > 1:
            return (None,) * len(self)
        with self._lock:
            return tuple(t for number in range(len(self.sources)) for t in self._layout(number).times())

    def frame_name(self, frame: int) -> str:
        """Name of the file a frame comes from, with the frame's number in it where it holds several."""
        number, inside = self._place(frame)
        name = self.sources[number].name
        return name if self._first_frames == 1 else f"{name} [{inside}]"

    def digests(self) -> dict[str, str]:
        """sha256 of every source that is there, by its path relative to the run's folder."""
        return {name_within(source, self._folder): digest_of(source) for source in self.sources}

    def _place(self, frame: int) -> tuple[int, int]:
        number = bisect_right(self._ends, frame)
        return number, frame - (self._ends[number - 1] if number else 0)

    def _read(self, frame: int) -> Field:
        number, inside = self._place(frame)
        layout = self._layout(number)
        if self._first_frames == 1 and layout.frames != 1:
            raise InputError(
                f"{self.sources[number].name}: holds {layout.frames} frames where the first file holds one; "
                "open it as a run of its own"
            )
        field, _ = frame_of(layout, inside, self.grid)
        if field.units != self.units:
            raise InputError(
                f'{self.sources[number].name}: is in "{field.units}" where the first file is in '
                f'"{self.units}"; keep only files of one kind in a run'
            )
        return self._timed(field, frame)

    def _timed(self, field: Field, frame: int) -> Field:
        interval = self.reading.frame_interval
        return field if interval is None else field.with_(time=frame * interval)

    def _layout(self, number: int) -> Layout:
        layout = self._layouts.get(number)
        if layout is None:
            layout = lay_out(read_contents(self.sources[number]), self.reading)
            if isinstance(layout.source, Rows) and layout.frames == 1 and number > 0:
                return layout  # a frame a file: its field is kept, its rows are not
            self._layouts[number] = layout
            while len(self._layouts) > KEPT_FILES:
                self._layouts.popitem(last=False)
        else:
            self._layouts.move_to_end(number)
        return layout
