"""A session's run kept in a store beside it, for quick scrubbing."""

from __future__ import annotations

from pathlib import Path

from fieldview.files import open_run
from fieldview.files.stored import write_store
from fieldview.publish.measuring import Progress
from fieldview.session.models import Session
from fieldview.session.store import load_session, save_session, stem_of


def store_name(path: Path) -> str:
    """Name of the run store of a session file, beside which it lies."""
    return f"{stem_of(path)}.store.h5"


def store_run(path: Path, *, progress: Progress, say) -> bool:
    """Make the run store of a session file and name it in the session; True where a frame is not readable.

    Raises InputError where the run cannot be opened or the store not written; the session is left as it was.
    """
    session = load_session(path)
    source = session.run
    run = open_run(source.files, source.reading, folder=session.folder)
    name = store_name(path)
    ticks = iter(progress(range(len(run)), "storing", len(run)))
    next(ticks, None)
    unread = write_store(run, path.parent / name, on_frame=lambda _: next(ticks, None))
    for sentence in unread:
        say(sentence)
    save_session(with_store(session, name), path)
    return bool(unread)


def with_store(session: Session, name: str) -> Session:
    """The session with its run read from a store of this name."""
    return session.model_copy(update={"run": session.run.model_copy(update={"store": name})}).in_folder(
        session.folder
    )
