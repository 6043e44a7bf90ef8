"""A run store: the frames of a run as they were read, in one binary file, so that scrubbing is quick.

It is made on request and never in place of the sources. What it holds is what reading them gave, to the last
bit; whether they are still the same is checked every time it is opened, and a store that no longer fits is
not used and said so.
"""

from __future__ import annotations

import hashlib
import json
import threading
from collections.abc import Callable
from functools import cached_property
from pathlib import Path

import numpy as np

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid, Placement
from fieldview.compute.units import Units
from fieldview.files.reading import Reading
from fieldview.files.run import Run, UnreadableFrame, digest_of, name_within
from fieldview.files.writing import said_if_unwritable, whole_file

FORMAT = "loopflux run store 1"


def write_store(run: Run, path: Path, *, on_frame: Callable[[int], None] | None = None) -> list[str]:
    """Keep a run in one file, whole or not at all; returns a sentence for every frame that could not be read.

    Frames that cannot be read are kept as that: the store says of them what their file says.

    Raises InputError where the file cannot be written.
    """
    import h5py

    seen = [_stamp(source) for source in run.sources]
    digests = run.digests()
    with said_if_unwritable(path), whole_file(path) as temporary, h5py.File(temporary, "w") as store:
        unread = _Written(store, run).frames(on_frame)
        store.attrs["format"] = FORMAT
        store.attrs["reading"] = run.reading.model_dump_json()
        store.attrs["units"] = str(run.units)
        store.attrs["notes"] = json.dumps(run.notes)
        stamps = zip(digests.items(), seen, strict=True)
        store.attrs["sources"] = json.dumps([(*entry, *stamp) for entry, stamp in stamps])
    return unread


class _Written:
    """The datasets of a store under way."""

    def __init__(self, store, run: Run):
        self.store, self.run, self.count = store, run, len(run)
        grid = run.grid
        store["x"], store["y"] = grid.x, grid.y
        place = grid.placement
        store.attrs["placement"] = [
            place.factor.real,
            place.factor.imag,
            place.shift.real,
            place.shift.imag,
            place.mirrored,
        ]

    def frames(self, on_frame) -> list[str]:
        times = np.array([np.nan if time is None else time for time in self.run.times])
        about, unread = [], []
        for number in range(self.count):
            told: dict = {"name": self.run.frame_name(number)}
            try:
                field = self.run[number]
            except UnreadableFrame as error:
                told["unreadable"] = str(error)
                unread.append(f"frame {number} cannot be read: {error}")
            else:
                times[number] = times[number] if field.time is None else field.time
                told |= self._arrays(number, field)
            about.append(json.dumps(told))
            if on_frame is not None:
                on_frame(number)
        self.store["time"] = times
        self.store["about"] = about
        return unread

    def _arrays(self, number: int, field: Field) -> dict:
        """Write a frame's arrays; which they are."""
        for name in field.components:
            self._put(name, number, field.measured[name], "f8")
        self._put("status", number, field.status, "u1")
        for name, values in field.channels.items():
            self._put(f"channels/{_escaped(name)}", number, values, "f8")
        sigma = field.error.sigma or {}
        for name, values in sigma.items():
            self._put(f"sigma/{name}", number, np.broadcast_to(values, field.grid.shape), "f8")
        return {
            "components": list(field.components),
            "channels": {name: field.channel_units.get(name) for name in field.channels},
            "sigma": list(sigma),
            "notes": list(field.notes),
        }

    def _put(self, name: str, number: int, values: np.ndarray, kind: str) -> None:
        if name not in self.store:
            shape = self.run.grid.shape
            self.store.create_dataset(name, (self.count, *shape), kind, chunks=(1, *shape))
        self.store[name][number] = values


class StoredRun:
    """A run from its store: the same frames as `fieldview.files.Run` gives, without reading the sources.

    Attributes are those of `Run`.
    """

    def __init__(self, path: Path, sources: tuple[Path, ...], *, folder: Path):
        self.sources, self._folder, self._lock = sources, Path(folder), threading.Lock()
        self._store = _opened(path)
        attributes = self._store.attrs
        self.reading = Reading.model_validate_json(attributes["reading"])
        self.units = Units.parse(attributes["units"])
        self.notes = tuple(json.loads(attributes["notes"]))
        a, b, c, d, mirrored = (float(value) for value in attributes["placement"])
        placement = Placement(complex(a, b), complex(c, d), bool(mirrored))
        self.grid = Grid(self._store["x"][:], self._store["y"][:], placement)

    @cached_property
    def _about(self) -> list[dict]:
        with self._lock:
            return [json.loads(text) for text in self._store["about"].asstr()[:]]

    @cached_property
    def times(self) -> tuple[float | None, ...]:
        with self._lock:
            return tuple(None if np.isnan(time) else float(time) for time in self._store["time"][:])

    def __len__(self) -> int:
        return len(self._about)

    def __getitem__(self, frame: int) -> Field:
        if not 0 <= frame < len(self):
            raise IndexError(f"frame {frame} of {len(self)}")
        about, time = self._about[frame], self.times[frame]
        if "unreadable" in about:
            raise UnreadableFrame(about["unreadable"])
        with self._lock:
            parts = {name: self._store[name][frame] for name in about["components"]}
            status = self._store["status"][frame]
            sigma = {name: self._store[f"sigma/{name}"][frame] for name in about["sigma"]}
            channels = {name: self._store[f"channels/{_escaped(name)}"][frame] for name in about["channels"]}
        return Field(
            self.grid,
            **parts,
            status=status,
            units=self.units,
            time=time,
            measured=parts,
            channels=channels,
            channel_units={name: unit for name, unit in about["channels"].items() if unit is not None},
            error=ErrorModel(sigma=sigma, origin="from file") if sigma else ErrorModel(),
            notes=tuple(about["notes"]),
        )

    def frame_name(self, frame: int) -> str:
        return self._about[frame]["name"]

    def digests(self) -> dict[str, str]:
        """sha256 of every source as it is now, as `Run.digests`."""
        return {name_within(source, self._folder): digest_of(source) for source in self.sources}


def why_unfit(path: Path, sources: tuple[Path, ...], reading: Reading, folder: Path) -> str | None:
    """Why a store does not stand for these sources read like this, in words; None where it does.

    A source of the same size and time of change is taken for the same; any other is held against its digest.
    """
    try:
        with _opened(path) as store:
            kept_reading, kept = store.attrs["reading"], json.loads(store.attrs["sources"])
    except InputError as error:
        return str(error)
    if kept_reading != reading.model_dump_json():
        return "the files are read in another way now"
    if [name for name, *_ in kept] != [name_within(source, folder) for source in sources]:
        return "the run has other files now"
    for (name, digest, *stamp), source in zip(kept, sources, strict=True):
        if list(_stamp(source)) != stamp and digest_of(source) != digest:
            return f"{name} has changed since"
    return None


def _opened(path: Path):
    import h5py

    try:
        store = h5py.File(path, "r")
    except FileNotFoundError:
        raise InputError(f"{path.name} is not there") from None
    except OSError:
        raise InputError(f"{path.name} is damaged or no run store") from None
    if store.attrs.get("format") != FORMAT:
        store.close()
        raise InputError(f"{path.name} is no run store")
    return store


def _stamp(source: Path) -> tuple[int, int]:
    """Size and time of change [ns]."""
    try:
        found = source.stat()
    except OSError as error:
        raise InputError(f"{source}: cannot be read ({error.strerror}); check the path") from None
    return found.st_size, found.st_mtime_ns


def _escaped(name: str) -> str:
    """A channel's name as that of a dataset, whose path a slash would cut."""
    return hashlib.sha256(name.encode()).hexdigest()[:16]
