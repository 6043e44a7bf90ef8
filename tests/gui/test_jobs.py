"""Background work: only the latest answer counts, and nothing is left running."""

import threading

import pytest

from fieldview.compute.errors import InputError
from fieldview.gui.jobs import LATER, Jobs, Progress


@pytest.fixture
def jobs(qapp):
    made = Jobs()
    yield made
    made.close()
    made.deleteLater()


@pytest.fixture
def heard(jobs):
    answers = []
    jobs.answered.connect(answers.append)
    return answers


def test_work_is_done_outside_the_window_thread_and_answered_inside(qtbot, jobs, heard):
    jobs.submit("square", lambda x: (x * x, threading.current_thread()), 7)
    assert not jobs.idle
    qtbot.waitUntil(lambda: jobs.idle)
    value, thread = heard[0].value
    assert value == 49
    assert thread is not threading.main_thread()


def test_late_answers_of_a_replaced_request_are_dropped(qtbot, jobs, heard):
    gate = threading.Event()
    jobs.submit("map", lambda: gate.wait(5) and "old")
    newest = jobs.submit("map", lambda: "new")
    gate.set()
    qtbot.waitUntil(lambda: jobs.idle)
    qtbot.wait(30)
    assert [a.value for a in heard] == ["new"]
    assert heard[0].request == newest


def test_long_work_gives_way_to_urgent_work_between_answers(qtbot, jobs, heard):
    gate = threading.Event()

    def slow():
        for number in range(3):
            gate.wait(5)
            yield number

    jobs.submit("follow", slow, urgency=LATER)
    jobs.submit("field", lambda: "frame")
    gate.set()
    qtbot.waitUntil(lambda: jobs.idle)
    values = [a.value for a in heard]
    assert values.index("frame") < values.index(2)
    assert [v for v in values if isinstance(v, int)] == [0, 1, 2]


def test_cancelled_work_stops_at_its_next_answer(qtbot, jobs, heard):
    reached, gate = [], threading.Event()

    def slow():
        for number in range(100):
            reached.append(number)
            yield number
            gate.wait(5)

    jobs.submit("follow", slow)
    qtbot.waitUntil(lambda: len(heard) == 1)
    jobs.cancel("follow")
    gate.set()
    assert jobs.idle
    jobs.close()
    assert len(reached) <= 2
    assert len(heard) == 1


def test_an_input_error_is_answered_as_its_own_sentence(qtbot, jobs, heard):
    def refuse():
        raise InputError("f3.csv, line 7: there are 3 columns instead of 4; add the missing one")

    jobs.submit("open", refuse)
    qtbot.waitUntil(lambda: jobs.idle)
    assert heard[0].failed
    assert heard[0].error.startswith("f3.csv, line 7")


def test_any_other_error_is_a_sentence_too(qtbot, jobs, heard):
    jobs.submit("map", lambda: 1 / 0, title="Drawing the map")
    qtbot.waitUntil(lambda: jobs.idle)
    assert heard[0].error.startswith("Drawing the map failed")
    assert "Traceback" not in heard[0].error


def test_progress_is_shown_not_answered(qtbot, jobs, heard):
    def slow():
        yield Progress(0.5)
        yield "done"

    shares = []
    jobs.changed.connect(lambda: shares.extend(t.share for t in jobs.tasks))
    jobs.submit("export", slow)
    qtbot.waitUntil(lambda: jobs.idle)
    assert 0.5 in shares
    assert [a.value for a in heard if not a.last] == ["done"]


def test_closing_waits_for_the_threads_and_refuses_more(jobs):
    jobs.submit("map", lambda: "x")
    jobs.close()
    assert not [t for t in threading.enumerate() if t.name.startswith("loopflux")]
    assert jobs.submit("map", lambda: "y") == 0
    assert jobs.idle
