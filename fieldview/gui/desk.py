"""The window's one changeable place: it holds the picture, and every change goes through it.

Commands and panels call the methods here; each puts a new picture in place of the old one, starts the
background work that the new picture needs, and says ``redrawn``. Nothing flows the other way.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from pydantic import ValidationError
from PySide6.QtCore import QObject, QTimer, Signal

from fieldview.compute.errors import InputError
from fieldview.gui import places, work
from fieldview.gui.jobs import LATER, Answer, Jobs
from fieldview.gui.kept_view import shown_from_view, view_from_shown
from fieldview.gui.picture import NOTHING, Notice, Picture
from fieldview.gui.pursuit import Pursuit
from fieldview.session.models import Session
from fieldview.session.undo import History


class Desk(QObject):
    redrawn = Signal()
    questioned = Signal()

    def __init__(self, parent: QObject | None = None):
        super().__init__(parent)
        self.picture = Picture()
        self.bench = None
        self.jobs = Jobs(self)
        self.jobs.answered.connect(self._answered)
        self.jobs.changed.connect(self._tasks_changed)
        self._pursuit = Pursuit(self)
        self._soon = QTimer(self)
        self._soon.setSingleShot(True)
        self._soon.timeout.connect(self.redrawn)
        self._recent: Path | None = None
        self._before: tuple | None = None
        self.opening: tuple[Session, Path | None] | None = None
        self.after_saving: Callable[[], None] | None = None

    # -- opening and saving --------------------------------------------------------------------------

    def open(self, paths) -> None:
        """Open a session file or the files of a run; what cannot be opened is said in the banner."""
        paths = [Path(path) for path in paths]
        if not paths:
            return
        try:
            self._recent = paths[0] if len(paths) == 1 else paths[0].parent
            if len(paths) == 1 and paths[0].suffix.lower() == ".json":
                from fieldview.session.store import load_session

                self.adopt(load_session(paths[0]), paths[0])
            else:
                self.adopt(work.session_of_files(paths), None)
        except InputError as error:
            self.complain(str(error))

    def open_sample(self, name: str) -> None:
        """Put a sample among the user's own things, once, and open it."""
        self.jobs.submit("sample", places.sample_session, name, lane="sample", title="Writing the sample")

    def adopt(self, session: Session, path: Path | None, *, saved: bool = True) -> None:
        """Take up a session: it becomes the first of a new history, and its run is opened."""
        self.jobs.cancel_all()
        self._before = (self.picture, self.bench) if self.picture.run is not None else None
        self.bench = None
        self._pursuit.forget()
        shown = shown_from_view(session.view, self.picture.shown)
        self.opening = (session, path)
        self._put(Picture(History(session), session if saved else None, path, shown))
        self.jobs.submit("open", work.open_session, session, title=f"Opening {_name(session, path)}")

    def save(self, path: Path) -> None:
        """Write the session in the background, whole or not at all; a failure is said in the banner."""
        session = self.picture.session
        if session is None:
            return
        view = view_from_shown(self.picture.shown)
        title = f"Saving {path.name}"
        self._saving = session
        self.jobs.submit("save", work.save, session, self.bench, path, view, title=title)

    def export(self, path: Path, names=()) -> None:
        if self.picture.field is not None:
            title = f"Writing {path.name}"
            self.jobs.submit(
                "export", work.export_field, self.picture.field, path, names, lane="derive", title=title
            )

    def report(self, path: Path) -> None:
        """Write the measurement report of the session as it is now, in the background."""
        from fieldview.gui.studies import work as studies

        name = self.picture.path.name if self.picture.path is not None else "a session not saved yet"
        given = (self.bench, self.picture.session, name, path)
        title = f"Writing {path.name}"
        self.jobs.submit("report", studies.report_file, *given, lane="study", title=title, reports=True)

    def store(self, path: Path) -> None:
        """Keep the run in one binary file in the background; the session then reads from it."""
        from fieldview.gui.studies import work as studies

        bench = self.bench.updated(self.picture.session)
        title = "Storing the run"
        self.jobs.submit("store", studies.store, bench, path, lane="study", title=title, reports=True)

    def follow(self) -> None:
        """Measure every region on every frame in the background; asked again while it runs, it stops."""
        picture = self.picture
        if picture.run is None or self.bench is None:
            return
        if self.jobs.is_pending("follow"):
            self.jobs.cancel("follow")
            return
        bench = self.bench.updated(picture.session)
        frames = [f for f in range(picture.run.frames) if not self._is_traced(f)]
        self.jobs.submit(
            "follow", work.follow_regions, bench, picture.session, frames, urgency=LATER, title="Following"
        )

    def _is_traced(self, frame: int) -> bool:
        """Whether the numbers of every region are known on a frame, as the session is now."""
        traced, session = self.picture.traces.get(frame), self.picture.session
        return traced is not None and all(traced.basis.holds(session, r) for r in session.regions)

    # -- editing -------------------------------------------------------------------------------------

    def commit(self, name: str, session: Session, **shown) -> None:
        """A new session under a name for Edit → Undo; one that changes nothing leaves no trace."""
        history = self.picture.history
        if history is None:
            return
        session = session.in_folder(history.session.folder)
        picture = self.picture.with_(
            history=history.edited(name, session), draft=None, draft_of=None, draft_measured=None
        )
        self._put(_still_there(picture.showing(**shown) if shown else picture))

    def undo(self) -> None:
        self._travel(History.undo)

    def redo(self) -> None:
        self._travel(History.redo)

    def _travel(self, move) -> None:
        if self.picture.history is not None:
            moved = self.picture.with_(
                history=move(self.picture.history), draft=None, draft_of=None, draft_measured=None
            )
            self._put(_still_there(moved))

    def edit(self, name: str, **changes) -> None:
        """Commit the session with these attributes changed, checked as if read from a file."""
        try:
            session = checked(self.picture.session, **changes)
        except InputError as error:
            self.complain(str(error))
            return
        self.commit(name, session)

    def add_region(self, region) -> None:
        from fieldview.gui.theme import region_colour
        from fieldview.publish.looks import REGION_COLOURS

        session = self.picture.session
        if session is None:
            return
        used = [region_colour(r.colour, place) for place, r in enumerate(session.regions)]
        colour = next(
            (c for c in REGION_COLOURS if c not in used), REGION_COLOURS[len(used) % len(REGION_COLOURS)]
        )
        region = region.model_copy(update={"colour": region.colour or colour})
        grown = session.model_copy(update={"regions": (*session.regions, region)})
        self.commit(f"Draw {region.name}", grown, selected=region.name)

    def change_region(self, name: str, region, title: str) -> None:
        """Put a region in another's place (a new name keeps it selected)."""
        session = self.picture.session
        try:
            # a copy with changes has not been checked; a region built anew has
            region = type(region).model_validate(region.model_dump())
            regions = tuple(region if r.name == name else r for r in session.regions)
            changed = checked(session, regions=regions)
        except ValidationError as error:
            self.drop_draft()
            self.complain(f"{name}: {plain(error)}.")
            return
        except InputError as error:
            self.drop_draft()
            self.complain(str(error))
            return
        self.commit(title, changed, selected=region.name)

    def free_name(self, stem: str) -> str:
        """``circle 1``, ``circle 2``, …: the first that no region has."""
        taken = {r.name for r in self.picture.session.regions} if self.picture.session else set()
        number = 1
        while f"{stem} {number}" in taken:
            number += 1
        return f"{stem} {number}"

    # -- looking -------------------------------------------------------------------------------------

    def show(self, **changes) -> None:
        """Look at something else, or in another way; no undo step."""
        picture = self.picture.showing(**changes)
        if picture.shown != self.picture.shown:
            self._put(picture)

    def go_to(self, frame: int) -> None:
        """Show this frame, held within the run."""
        run = self.picture.run
        if run is not None:
            self.show(frame=min(max(frame, 0), run.frames - 1))

    def point_at(self, at: complex | None) -> None:
        if at != self.picture.cursor:
            self._put(self.picture.with_(cursor=at))

    def is_over_field(self, at: complex) -> bool:
        field = self.picture.field
        if field is None:
            return False
        local = complex(field.grid.placement.to_lattice(at))
        x, y = field.grid.x, field.grid.y
        return bool(x[0] <= local.real <= x[-1] and y[0] <= local.imag <= y[-1])

    def draft(self, region, of: str | None = None) -> None:
        """A region as it is being drawn or dragged, with its numbers, before it becomes an edit."""
        picture = self.picture
        measured = None
        if picture.field is not None and picture.prepared is not None and region.outline().problem() is None:
            measured = work.measure_quickly(picture.session, picture.field, picture.prepared, (region,))[0]
        self._put(picture.with_(draft=region, draft_of=of, draft_measured=measured))

    def drop_draft(self) -> None:
        if self.picture.draft is not None:
            self._put(self.picture.with_(draft=None, draft_of=None, draft_measured=None))

    def complain(self, text: str, *offers: tuple[str, str]) -> None:
        """Say in the banner what happened and what to do."""
        self._put(self.picture.with_(notice=Notice(text, offers=offers)))

    def tell(self, text: str, *offers: tuple[str, str]) -> None:
        self._put(self.picture.with_(notice=Notice(text, grave=False, offers=offers)))

    @property
    def idle(self) -> bool:
        """Whether nothing is being worked on and everything that came is drawn."""
        return self.jobs.idle and self._pursuit.idle and not self._soon.isActive()

    def dismiss(self) -> None:
        self.opening = None if not self.jobs.is_pending("open") else self.opening
        if self.picture.notice is not None:
            self._put(self.picture.with_(notice=None))

    # -- background answers --------------------------------------------------------------------------

    def update(self, **changes) -> None:
        """Put answers of background work into the picture."""
        self._put(self.picture.with_(**changes), soon=True)

    def _answered(self, answer: Answer) -> None:
        if answer.failed:
            self._failed(answer)
        elif answer.kind == "open":
            self._opened(answer.value)
        elif answer.kind == "save":
            self.update(saved=self._saving, path=answer.value, notice=None)
            if self.after_saving is not None:
                follow, self.after_saving = self.after_saving, None
                follow()
        elif answer.kind.startswith("study.") or answer.kind == "warm":
            return  # the sheet that asked shows it
        elif answer.kind == "store":
            run = self.picture.session.run.model_copy(update={"store": answer.value.name})
            self.edit("Read the run from its store", run=run)
            self.tell(f"The run is kept in {answer.value.name}; save the session to use it next time.")
        elif answer.kind in ("export", "report"):
            self.tell(f"{answer.value.name} was written to {answer.value.parent}.")
        elif answer.kind == "sample":
            self.open([answer.value])
        elif answer.kind == "digests":
            if answer.value:
                self.tell(f"{'; '.join(answer.value)}. The numbers are of the files as they are now.")
        elif answer.value is not None:
            self._pursuit.answered(answer)

    def _opened(self, opened: work.Opened) -> None:
        self.bench, self._before, self.opening = opened.bench, None, None
        if self._recent is not None:
            places.add_recent(self._recent)
        frame = min(self.picture.shown.frame, opened.facts.frames - 1)
        session = opened.session.in_folder(self.picture.session.folder)
        saved = session if self.picture.saved is not None else None
        picture = self.picture.showing(frame=frame)
        notice = _said_on_opening(opened.facts.notes) if self.picture.path is None else None
        self._put(picture.with_(history=History(session), saved=saved, run=opened.facts, notice=notice))
        if session.run.digests:
            self.jobs.submit("digests", work.changed_sources, opened.bench, lane="digests", urgency=LATER)

    def _failed(self, answer: Answer) -> None:
        if answer.kind == "open":
            offers = (("Answer …", "sheet.reading"),) if answer.questions else ()
            notice = Notice(answer.error, offers=offers)
            self._put(self._without_opening().with_(notice=notice, tasks=self.jobs.tasks))
            if answer.questions:
                self.questioned.emit()
            return
        if answer.kind == "save":
            self.after_saving = None
        self.complain(answer.error)

    def _without_opening(self) -> Picture:
        """What the window shows where opening came to nothing: what was open before, if there was a run."""
        if self._before is not None:
            picture, self.bench = self._before
            self._before = None
            self._pursuit.forget()
            return picture
        return self.picture if self.picture.path is not None else Picture(shown=self.picture.shown)

    def cancel(self, kind: str) -> None:
        """Stop background work; what it was for is taken back, so that the window shows what is so."""
        self.jobs.cancel(kind)
        picture = self.picture
        if kind == "open":
            self._put(self._without_opening().with_(tasks=self.jobs.tasks))
            self.opening = None
        elif kind == "field" and picture.shown.source != "frame":
            self.show(source="frame")
        elif kind == "field" and picture.field is not None:
            if picture.field_frame != picture.shown.frame:
                self.show(frame=picture.field_frame)
            else:
                self.undo()

    def _tasks_changed(self) -> None:
        self._put(self.picture.with_(tasks=self.jobs.tasks), pursue=False, soon=True)

    def _put(self, picture: Picture, *, pursue: bool = True, soon: bool = False) -> None:
        """Put a new picture in place. What the user did is drawn at once; answers that come in numbers are
        drawn together, at the next turn of the event loop."""
        self.picture = picture
        if pursue:
            self._pursuit.pursue()
        if soon:
            self._soon.start()
        else:
            self._soon.stop()
            self.redrawn.emit()


def checked(session: Session, **changes) -> Session:
    """The session with changes, validated as a whole; raises InputError with one plain sentence."""
    kept = {name: getattr(session, name) for name in Session.model_fields}
    try:
        return Session.model_validate({**kept, **changes}).in_folder(session.folder)
    except ValidationError as error:
        raise InputError(plain(error)) from None


def plain(error: ValidationError) -> str:
    """The first thing that is wrong, with its place."""
    first = error.errors()[0]
    place = ".".join(str(part) for part in first["loc"])
    message = first["msg"].removeprefix("Value error, ")
    message = message[:1].lower() + message[1:]
    return f"{place}: {message}" if place else message


def _said_on_opening(notes: tuple[str, ...]) -> Notice | None:
    """What reading had to assume, for files opened without a session; the ledger's first line keeps it."""
    if not notes:
        return None
    sentences = [f"{note[:1].upper()}{note[1:].rstrip('.')}." for note in notes[:3]]
    more = [f"{len(notes) - 3} more remarks stand in the ledger's first line."] if len(notes) > 3 else []
    offers = (("How the files are read …", "sheet.reading"),)
    return Notice(" ".join([*sentences, *more]), grave=False, offers=offers)


def _still_there(picture: Picture) -> Picture:
    """Forget a selection whose region or ledger line is gone."""
    names = {r.name for r in picture.session.regions}
    lines = len(picture.session.ledger)
    shown = picture.shown
    changes = {}
    if shown.selected not in names:
        changes["selected"] = None
    if shown.line is not None and shown.line >= lines:
        changes["line"] = None
    if shown.as_of is not None and shown.as_of >= lines:
        changes["as_of"] = None
    return _measured_anew(picture.showing(**changes))


def _measured_anew(picture: Picture) -> Picture:
    """With quick numbers for the regions that an edit changed; the full ones follow in the background."""
    kept = {
        r.name: picture.measured[r.name]
        for r in picture.session.regions
        if r.name in picture.measured
        and picture.measured[r.name].region == r
        and picture.measured[r.name].line == picture.session.line
    }
    changed = tuple(r for r in picture.session.regions if r.name not in kept)
    if picture.field is not None and picture.prepared is not None:
        quick = work.measure_quickly(picture.session, picture.field, picture.prepared, changed)
        kept |= {m.region.name: m for m in quick}
    return picture.with_(measured=kept or NOTHING)


def _name(session: Session, path: Path | None) -> str:
    return path.name if path is not None else session.run.files[0]
