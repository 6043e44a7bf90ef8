"""Nothing is lost: unsaved work is asked about, and a killed program's changes are offered again."""

import os
import signal
import subprocess
import sys
import textwrap

from PySide6.QtWidgets import QPushButton

from fieldview.gui.recovery import lost_sessions
from fieldview.session.store import load_session
from tests.gui.conftest import action, drag, settle


def offers(window) -> dict[str, QPushButton]:
    return {b.text(): b for b in window.banner.findChildren(QPushButton)}


def edited(window):
    action(window, "tool.circle").trigger()
    drag(window, (0.04, 0.03), (0.05, 0.035))
    assert window.desk.picture.unsaved
    return window.session


def test_closing_with_unsaved_work_asks_in_the_banner(window, session_file, qtbot):
    session = edited(window)
    window.close()
    assert window.isVisible()
    assert "not saved" in window.banner.text.text()
    offers(window)["Save and close"].click()
    qtbot.waitUntil(lambda: not window.isVisible())
    assert load_session(session_file).regions == session.regions
    assert lost_sessions() == []


def test_work_can_be_given_up(window, session_file):
    before = session_file.read_bytes()
    edited(window)
    window.close()
    offers(window)["Close without saving"].click()
    assert not window.isVisible()
    assert session_file.read_bytes() == before
    assert lost_sessions() == []


def test_a_second_close_goes_through_and_keeps_the_changes_for_the_next_start(
    window, open_window, qtbot, session_file
):
    session = edited(window)
    window.close()
    window.close()
    assert not window.isVisible()
    again = open_window()
    assert "without saving" in again.banner.text.text()
    offers(again)["Recover"].click()
    settle(qtbot, again)
    assert again.session == session
    assert again.desk.picture.unsaved
    assert again.desk.picture.path == session_file


def test_closing_without_changes_asks_nothing(window):
    window.close()
    assert not window.isVisible()
    assert lost_sessions() == []


def test_a_living_window_is_not_offered_as_lost(window, open_window):
    edited(window)
    assert lost_sessions() == []
    assert not open_window().banner.isVisible()


def test_changes_survive_a_kill(session_file, open_window, qtbot):
    script = textwrap.dedent(
        """
        import sys, time
        from PySide6.QtWidgets import QApplication
        from fieldview.gui.app import create_window
        window = create_window([sys.argv[1]])
        while not window.idle:
            QApplication.processEvents()
        circle = window.session.regions[0].model_copy(update={"radius": 0.0123})
        window.desk.change_region("core", circle, "Reshape core")
        print("ready", flush=True)
        time.sleep(60)
        """
    )
    program = subprocess.Popen(
        [sys.executable, "-c", script, str(session_file)], stdout=subprocess.PIPE, text=True, env=os.environ
    )
    with program:
        assert program.stdout.readline().strip() == "ready"
        program.send_signal(signal.SIGKILL)
    window = open_window()
    assert "vortex.session.json" in window.banner.text.text()
    offers(window)["Recover"].click()
    settle(qtbot, window)
    assert window.session.regions[0].radius == 0.0123
    assert load_session(session_file).regions[0].radius == 0.015, "nothing is written before saving"


def test_a_lost_session_can_be_discarded_and_a_spoilt_file_is_ignored(window, open_window):
    from fieldview.gui import places

    edited(window)
    window.close()
    window.close()
    (places.state_folder() / "recovery" / "1-1.json").write_text("{")
    again = open_window()
    offers(again)["Discard"].click()
    assert lost_sessions() == []
    assert not again.banner.isVisible()
