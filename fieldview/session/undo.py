"""Undo and redo over session values."""

from __future__ import annotations

from dataclasses import dataclass, replace

from fieldview.session.models import Session


@dataclass(frozen=True, eq=False)
class History:
    """The session now, and the named edits on either side of it. Itself a value: every move makes a new one.

    ``done`` holds (name, session before the edit), oldest first; ``undone`` holds (name, session after
    the edit), next redo last.
    """

    session: Session
    done: tuple[tuple[str, Session], ...] = ()
    undone: tuple[tuple[str, Session], ...] = ()

    def edited(self, name: str, session: Session) -> History:
        """After an edit with this name; an edit that changes nothing leaves no trace."""
        if session == self.session:
            return self
        return History(session, (*self.done, (name, self.session)))

    def undo(self) -> History:
        """One edit back; the same history where there is none."""
        if not self.done:
            return self
        *rest, (name, before) = self.done
        return replace(self, session=before, done=tuple(rest), undone=(*self.undone, (name, self.session)))

    def redo(self) -> History:
        """One edit forward; the same history where there is none."""
        if not self.undone:
            return self
        *rest, (name, after) = self.undone
        return replace(self, session=after, done=(*self.done, (name, self.session)), undone=tuple(rest))

    @property
    def undo_name(self) -> str | None:
        return self.done[-1][0] if self.done else None

    @property
    def redo_name(self) -> str | None:
        return self.undone[-1][0] if self.undone else None
