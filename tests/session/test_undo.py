"""Undo and redo as laws over any sequence of edits."""

from hypothesis import given
from hypothesis import strategies as st

from fieldview.session.models import RunSource, Session
from fieldview.session.undo import History

FIRST = Session(run=RunSource(files=("a.csv",)))


def titled(history: History, title: str) -> History:
    return history.edited(f"Call it {title}", history.session.model_copy(update={"title": title}))


@given(st.lists(st.sampled_from(["undo", "redo", "a", "b", "c"]), max_size=30))
def test_undoing_everything_restores_the_first_session(moves):
    history = History(FIRST)
    for move in moves:
        history = getattr(history, move)() if move in ("undo", "redo") else titled(history, move)
    last = history.session
    edits = len(history.done)
    for _ in range(edits):
        history = history.undo()
    assert history.session == FIRST and history.undo_name is None
    for _ in range(edits):
        history = history.redo()
    assert history.session == last


def test_edits_have_names_and_a_new_edit_ends_redoing():
    history = titled(titled(History(FIRST), "a"), "b").undo()
    assert (history.undo_name, history.redo_name) == ("Call it a", "Call it b")
    history = titled(history, "c")
    assert (history.undo_name, history.redo_name) == ("Call it c", None)


def test_an_edit_that_changes_nothing_leaves_no_trace():
    history = History(FIRST)
    assert history.edited("Nothing", FIRST.model_copy()) is history
    assert history.undo() is history and history.redo() is history
