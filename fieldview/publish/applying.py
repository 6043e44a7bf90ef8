"""Cleaned fields of a run, its region table and the record of what was done, in one folder.

Everything stands under its final name only when it is whole. What is on the way lies in a folder of its own
inside, so that a killed run goes on where it stopped and ends with the same bytes.
"""

from __future__ import annotations

import hashlib
import json
import shutil
from collections import Counter
from collections.abc import Iterator, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import fieldview
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.quantities import QUANTITIES
from fieldview.files import UnreadableFrame
from fieldview.files.writers import ENDINGS, writer
from fieldview.files.writing import write_lines, write_whole
from fieldview.publish.maps import quantity_values
from fieldview.publish.measuring import Progress
from fieldview.publish.sharing import Share, bench_of, in_order
from fieldview.publish.tables import csv_lines
from fieldview.session.frames import Frame, left_out
from fieldview.session.ledger import Tally
from fieldview.session.measure import chosen_frames, frame_row, unanswered
from fieldview.session.replay import Workbench
from fieldview.session.store import dump_session, load_session, session_digest, stem_of

_UNFINISHED = ".unfinished"


def apply_session(
    path: Path,
    folder: Path,
    *,
    frames: str | None = None,
    to: str = "csv",
    quantities: Sequence[str] = (),
    progress: Progress,
    say,
    executor: Executor | None = None,
    strict: bool = False,
) -> bool:
    """Write the cleaned fields of a session's frames into a folder; True where there was anything to remark.

    NAME_NNNNN.csv, or in another format of `fieldview.files.writers`, for each frame, ``regions.csv`` and
    ``record.json``. The same session goes on in a folder where it was stopped; ``say`` is told every
    changed source, skipped frame and region without an answer.

    ``strict`` ends the work at the first frame that cannot be read.

    Raises InputError where the session, the run, the frames or the folder cannot be used; nothing is written
    then.
    """
    if to not in ENDINGS:
        raise InputError(f"--to {to} is not known; use {', '.join(ENDINGS)}")
    for name in quantities:
        if name not in QUANTITIES:
            raise InputError(f'there is no quantity "{name}"; there are {", ".join(QUANTITIES)}')
    bench = Workbench(load_session(path))
    work = _Work(path, folder, bench, tuple(chosen_frames(bench, frames)), to, tuple(quantities))
    remarks = bench.changed_sources()
    # the first field tells whether the ledger and the quantities fit the run, before anything is written
    quantity_values(bench.field(work.frames[0]), work.quantities)
    for sentence in remarks:
        say(sentence)
    finished = work.finished_remarks()
    if finished is not None:
        say(f"{folder}: everything is there already")
        for sentence in finished:
            say(sentence)
        return bool(remarks or finished)
    work.claim_folder()
    waiting = [frame for frame in work.frames if not work.is_done(frame)]
    share = Share.of(bench.session)
    jobs = [(share, work.order, frame) for frame in waiting]
    for frame, skipped in progress(in_order(_do, jobs, executor), "applying", len(waiting)):
        if skipped and strict:
            work.forget(frame)  # tried again where the same work goes on
            raise InputError(skipped)
    # only the short part of every frame is held; the rows of the table are read once more when it is written
    parts = [work.part(frame) for frame in work.frames]
    for part in parts:
        for sentence in part["remarks"]:
            say(sentence)
    if all(part["skipped"] for part in parts):
        shutil.rmtree(work.unfinished)
        raise InputError(parts[0]["remarks"][0])
    work.finish(parts)
    return bool(remarks) or any(part["remarks"] for part in parts)


def _do(job) -> tuple[Frame, str]:
    """One frame's work, in this or another process: the frame, and why it was skipped or nothing."""
    share, order, frame = job
    return frame, _Work(bench=bench_of(share), **order).do(frame)


@dataclass(frozen=True, eq=False)
class _Work:
    """One application of a session to a folder."""

    path: Path
    folder: Path
    bench: Workbench
    frames: tuple[Frame, ...]
    to: str
    quantities: tuple[str, ...]

    @property
    def order(self) -> dict:
        """Everything but the workbench, to be sent to workers."""
        return {
            "path": self.path,
            "folder": self.folder.absolute(),
            "frames": self.frames,
            "to": self.to,
            "quantities": self.quantities,
        }

    @property
    def name(self) -> str:
        return stem_of(self.path)

    @property
    def unfinished(self) -> Path:
        return self.folder / _UNFINISHED

    @cached_property
    def identity(self) -> str:
        """Digest of everything the results depend on."""
        told = {
            "program": fieldview.__version__,
            "session": dump_session(self.bench.session),
            "sources": self.bench.run.digests(),
            "frames": self.frames,
            "to": self.to,
            "quantities": self.quantities,
        }
        return "sha256:" + hashlib.sha256(json.dumps(told, sort_keys=True).encode()).hexdigest()

    def claim_folder(self) -> None:
        """Make the folder ours, or go on in it. InputError where it holds the results of something else."""
        claimed = _text(self.unfinished / "identity") or _identity_in(_text(self.folder / "record.json"))
        if claimed is None and any(self._taken()):
            raise InputError(
                f"{self.folder}: holds {next(self._taken())} already; choose another folder for --out"
            )
        if claimed is not None and claimed != self.identity:
            raise InputError(
                f"{self.folder}: holds the results of another session, other sources or other options; "
                "choose another folder for --out"
            )
        try:
            self.unfinished.mkdir(parents=True, exist_ok=True)
            write_whole(self.unfinished / "identity", self.identity.encode())
        except OSError as error:
            raise InputError(
                f"{self.folder}: cannot be written to ({error.strerror}); choose another folder"
            ) from None

    def finished_remarks(self) -> list[str] | None:
        """The remarks of these very results where they are in the folder already, else None."""
        text = _text(self.folder / "record.json")
        if text is None or _identity_in(text) != self.identity:
            return None
        frames = json.loads(text)["frames"]
        whole = all((self.folder / entry["file"]).is_file() for entry in frames if "file" in entry)
        return [sentence for entry in frames for sentence in entry["remarks"]] if whole else None

    def _taken(self):
        """Names in the folder that the results would take."""
        if self.folder.is_dir():
            ours = (f"{self.name}_", "regions.csv", "record.json")
            yield from (entry.name for entry in self.folder.iterdir() if entry.name.startswith(ours))
        elif self.folder.exists():
            raise InputError(f"{self.folder}: is a file; choose a folder for --out")

    def field_name(self, frame: Frame) -> str:
        number = frame.replace(":", "_") if isinstance(frame, str) else f"{frame:05d}"
        return f"{self.name}_{number}.{self.to}"

    def is_done(self, frame: Frame) -> bool:
        """Whether a frame's part of the table is there, and its field unless it was skipped."""
        text = _text(self._part_path(frame))
        if text is None:
            return False
        return json.loads(text)["skipped"] or (self.folder / self.field_name(frame)).is_file()

    def do(self, frame: Frame) -> str:
        """Write one frame's field and its part of the table; returns why it was skipped, or nothing."""
        try:
            field, tallies = self._field(frame)
            row = frame_row(self.bench.session, frame, field)
        except UnreadableFrame as error:
            if isinstance(frame, str):
                raise
            why = f"frame {frame} was skipped: {error}"
            self._keep(frame, {"skipped": True, "remarks": [why]})
            return why
        part = {
            "skipped": False,
            "remarks": [
                *(f"frame {frame}: {sentence}" for sentence in left_out(field.notes)),
                *(f'frame {frame}: "{name}" has no value' for name in unanswered(row)),
            ],
            "row": row,
            "ledger": [tally.counts for tally in tallies],
            "outcomes": [tally.outcome for tally in tallies],
            "status": {status.name.lower(): field.count(status) for status in Status},
            "sigma": field.error.origin,
        }
        self._keep(frame, part)
        attributes = {"session": self.path.name, "session_digest": session_digest(self.bench.session)}
        if self.bench.session.title:
            attributes["title"] = self.bench.session.title
        writer(self.to)(
            self.folder / self.field_name(frame),
            field,
            quantities=quantity_values(field, self.quantities),
            attributes=attributes,
        )
        return ""

    def _field(self, frame: Frame) -> tuple[Field, tuple[Tally, ...]]:
        if isinstance(frame, str):
            return self.bench.field(frame), ()
        return self.bench.replayed(frame)

    def forget(self, frame: Frame) -> None:
        """A frame as if it had not been tried."""
        self._part_path(frame).unlink(missing_ok=True)

    def _keep(self, frame: Frame, part: dict) -> None:
        write_whole(self._part_path(frame), json.dumps(part, allow_nan=False).encode())

    def part(self, frame: Frame) -> dict:
        """What the record says of a frame, without its row of the table."""
        part = json.loads(self._part_path(frame).read_text())
        row = part.pop("row", None)
        return part | {"time": None if row is None else row["time"]}

    def _rows(self) -> Iterator[dict]:
        """Rows of the table, one frame at a time."""
        for frame in self.frames:
            part = json.loads(self._part_path(frame).read_text())
            if not part["skipped"]:
                yield part["row"]

    def _part_path(self, frame: Frame) -> Path:
        return self.unfinished / f"{str(frame).replace(':', '_')}.json"

    def finish(self, parts: list[dict]) -> None:
        """Write table and record, and clear away what was on the way."""
        if self.bench.session.regions:
            write_lines(self.folder / "regions.csv", csv_lines(self._rows()))
        record = json.dumps(self._record(parts), indent=1, ensure_ascii=False, allow_nan=False)
        write_whole(self.folder / "record.json", (record + "\n").encode())
        for scratch in self.folder.glob(f".{self.name}_*"):
            scratch.unlink()  # left by a run that was killed while it wrote
        shutil.rmtree(self.unfinished)

    def _record(self, parts: list[dict]) -> dict:
        """What was done: nothing in it depends on when, where or by whom."""
        session, run = self.bench.session, self.bench.run
        done = [part for part in parts if not part["skipped"]]
        lines = self.bench.tallies(self.frames[0]) if not isinstance(self.frames[0], str) else []
        return {
            "format": "loopflux-record",
            "version": 1,
            "identity": self.identity,
            "program": f"loopflux {fieldview.__version__}",
            "session": self.path.name,
            "session_digest": session_digest(session),
            "sources": run.digests(),
            "reading": {"units": str(run.units), "remarks": list(run.notes)},
            "error_model": session.error_model.model_dump(mode="json", exclude_none=True),
            "sigma": done[0]["sigma"],
            "derivative": session.derivative,
            "line": session.line,
            "ledger": [
                {"line": tally.line + 1, "sentence": tally.sentence, "counts": _totals(done, tally.line)}
                for tally in lines
            ],
            "quantities": list(self.quantities),
            "frames": [
                {
                    "frame": frame,
                    "time": part["time"],
                    "file": self.field_name(frame),
                    "vectors": part["status"],
                    "ledger": part["outcomes"],
                    "remarks": part["remarks"],
                }
                if not part["skipped"]
                else {"frame": frame, "remarks": part["remarks"]}
                for frame, part in zip(self.frames, parts, strict=True)
            ],
        }


def _totals(parts: list[dict], line: int) -> dict[str, int]:
    total: Counter = Counter()
    for part in parts:
        total.update(part["ledger"][line])
    return dict(total)


def _text(path: Path) -> str | None:
    return path.read_text() if path.is_file() else None


def _identity_in(record: str | None) -> str | None:
    if record is None:
        return None
    try:
        return json.loads(record).get("identity", "unknown")
    except (ValueError, AttributeError):
        return "unknown"
