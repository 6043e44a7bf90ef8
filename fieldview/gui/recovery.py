"""Every change is kept in a recovery file; one left by a program that died is offered at the next start."""

from __future__ import annotations

import itertools
import json
import os
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from PySide6.QtCore import QLockFile

from fieldview.compute.errors import InputError
from fieldview.gui import places
from fieldview.session.models import Session

_numbers = itertools.count(1)


@dataclass(frozen=True, eq=False)
class Lost:
    """A session found in a recovery file: where it belonged, and when it was changed last."""

    file: Path
    session: Session
    path: Path | None
    changed: str

    @property
    def sentence(self) -> str:
        name = self.path.name if self.path else self.session.run.files[0]
        return (
            f"The program ended without saving: changes to {name} up to {self.changed} were kept. "
            "Recover takes them up again; nothing is written over until you save."
        )


class Recovery:
    """The recovery file of one window. The lock beside it tells the living from the dead."""

    def __init__(self):
        self.folder = places.state_folder() / "recovery"
        self._file = self.folder / f"{os.getpid()}-{next(_numbers)}.json"
        self._lock: QLockFile | None = None

    def keep(self, session: Session, path: Path | None) -> None:
        """Write the session as it is now; a folder that cannot be written to leaves only the session file."""
        from fieldview.session.store import write_whole

        try:
            self.folder.mkdir(parents=True, exist_ok=True)
            if self._lock is None:
                self._lock = QLockFile(str(self._file.with_suffix(".lock")))
                self._lock.setStaleLockTime(0)
                self._lock.tryLock(0)
            write_whole(self._file, _document(session, path).encode())
        except OSError:
            return

    def drop(self) -> None:
        """The changes are saved, or were given up: there is nothing to recover any more."""
        self._file.unlink(missing_ok=True)
        self.let_go()

    def let_go(self) -> None:
        """Leave the file for the next start."""
        if self._lock is not None:
            self._lock.unlock()
            self._lock = None


def lost_sessions() -> list[Lost]:
    """What earlier programs left, newest first. Files of windows that live are not touched."""
    folder = places.state_folder() / "recovery"
    found = []
    for file in sorted(folder.glob("*.json"), key=lambda f: f.stat().st_mtime, reverse=True):
        lock = QLockFile(str(file.with_suffix(".lock")))
        lock.setStaleLockTime(0)
        if not lock.tryLock(0):
            continue
        lock.unlock()
        session = _read(file)
        if session is not None:
            found.append(session)
    return found


def _document(session: Session, path: Path | None) -> str:
    kept = {
        "path": str(path) if path else None,
        "folder": str(session.folder.absolute()),
        "session": session.model_dump(mode="json", exclude_none=True),
    }
    return json.dumps(kept)


def _read(file: Path) -> Lost | None:
    """The session in a recovery file; a spoilt file is no session and is taken away."""
    from fieldview.session.store import parse_session

    try:
        kept = json.loads(file.read_text(encoding="utf-8"))
        session = parse_session(json.dumps(kept["session"]), name=file.name).in_folder(kept["folder"])
        path = Path(kept["path"]) if kept.get("path") else None
    except (OSError, ValueError, KeyError, TypeError, InputError):
        file.unlink(missing_ok=True)
        return None
    when = datetime.fromtimestamp(file.stat().st_mtime).strftime("%d %B, %H:%M")
    return Lost(file, session, path, when)
