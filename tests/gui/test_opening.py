"""Opening sessions, files, folders and what is dropped; errors in the banner, never modal."""

import json

import pytest
from PySide6.QtCore import QMimeData, QPointF, Qt, QUrl
from PySide6.QtGui import QDragEnterEvent, QDropEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QPushButton, QWidget

from tests.gui.conftest import FRAMES, settle

PANELS = ("canvas", "ledger", "quantities", "readout", "regions", "time_strip")


def test_a_session_opens_with_its_regions_and_all_panels(window):
    assert [r.name for r in window.session.regions] == ["core"]
    assert window.desk.picture.run.frames == FRAMES
    for name in PANELS:
        assert window.findChild(QWidget, name).isVisible(), name


def test_the_session_is_there_before_the_run_has_been_read(open_window, session_file):
    window = open_window(session_file, idle=False)
    assert window.session is not None
    assert not window.idle


def test_a_folder_and_single_files_open(open_window, run_folder):
    assert open_window(run_folder).desk.picture.run.frames == FRAMES
    two = open_window(run_folder / "f0.csv", run_folder / "f2.csv")
    assert two.desk.picture.run.frames == 2
    assert two.session.units == "m, s"
    for name in PANELS:
        assert two.findChild(QWidget, name).isVisible(), name


def test_one_frame_shows_every_panel(open_window, run_folder):
    window = open_window(run_folder / "f1.csv")
    assert window.desk.picture.run.frames == 1
    assert all(window.findChild(QWidget, name).isVisible() for name in PANELS)


def test_files_can_be_dropped_on_the_window(open_window, run_folder, qtbot):
    window = open_window()
    assert window.session is None
    assert window.findChild(QWidget, "start").isVisible()
    dropped = QMimeData()
    dropped.setUrls([QUrl.fromLocalFile(str(run_folder))])
    args = (Qt.DropAction.CopyAction, dropped, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier)
    entering = QDragEnterEvent(QPointF(300, 300).toPoint(), *args)
    QApplication.sendEvent(window, entering)
    assert entering.isAccepted()
    QApplication.sendEvent(window, QDropEvent(QPointF(300, 300), *args))
    settle(qtbot, window)
    assert window.desk.picture.run.frames == FRAMES


@pytest.mark.parametrize(
    ("spoil", "word"),
    [
        (lambda d: d | {"colour": 3}, "colour"),
        (lambda d: d | {"version": 99}, "version 99"),
        (lambda d: d | {"ledger": [{"step": "polish"}]}, "polish"),
        (lambda d: d | {"run": {"files": ["nowhere/*.csv"]}}, "nowhere"),
    ],
)
def test_a_session_that_cannot_be_used_is_explained(open_window, session_file, spoil, word):
    session_file.write_text(json.dumps(spoil(json.loads(session_file.read_text()))))
    window = open_window(session_file)
    assert window.banner.isVisible()
    assert word in window.banner.text.text()
    assert "Traceback" not in window.banner.text.text()
    assert QApplication.activeModalWidget() is None


def test_missing_and_unreadable_files_are_explained(open_window, tmp_path):
    window = open_window(tmp_path / "gone.csv")
    assert "gone.csv" in window.banner.text.text()
    empty = tmp_path / "empty.csv"
    empty.write_text("")
    window = open_window(empty)
    assert "empty.csv" in window.banner.text.text()
    assert window.session is None
    window.findChild(QWidget, "banner")._close.click()
    assert not window.banner.isVisible()


def test_a_bad_file_leaves_what_was_open(window, tmp_path, qtbot):
    before = window.session
    window.open([tmp_path / "gone.session.json"])
    settle(qtbot, window)
    assert window.session == before
    assert "gone.session.json" in window.banner.text.text()


def test_a_source_that_changed_on_disk_is_said_not_refused(open_window, session_file, qtbot):
    from tests.gui.conftest import action

    window = open_window(session_file)
    action(window, "session.save").trigger()
    settle(qtbot, window)
    source = session_file.parent / "run" / "f2.csv"
    source.write_text(source.read_text().replace("0.1", "0.2", 1))
    again = open_window(session_file)
    assert "f2.csv has changed since the session was saved" in again.banner.text.text()
    assert again.desk.picture.field is not None


def test_what_was_open_is_remembered(open_window, session_file, window):
    from fieldview.gui import places

    assert places.recent()[0] == str(session_file)
    window.close()
    start = open_window().start
    names = [b.text() for b in start.findChildren(QWidget) if hasattr(b, "text")]
    assert any(session_file.name in name for name in names)


def test_opening_over_unsaved_work_asks(window, run_folder, qtbot):
    from fieldview.session.regions import Circle

    window.desk.add_region(Circle(name="mine", centre=(0.03, 0.02), radius=0.005))
    changed = window.session
    window.open([run_folder / "f1.csv"])
    assert window.session == changed
    assert "not saved" in window.banner.text.text()
    button = next(b for b in window.banner.findChildren(QPushButton) if b.text() == "Open without saving")
    QTest.mouseClick(button, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert window.session.regions == ()
    assert window.desk.picture.run.frames == 1


def test_work_is_saved_first_when_asked_to(window, session_file, run_folder, qtbot):
    from fieldview.session.regions import Circle
    from fieldview.session.store import load_session

    window.desk.add_region(Circle(name="mine", centre=(0.03, 0.02), radius=0.005))
    window.open([run_folder / "f1.csv"])
    button = next(b for b in window.banner.findChildren(QPushButton) if b.text() == "Save and open")
    QTest.mouseClick(button, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert [r.name for r in load_session(session_file).regions] == ["core", "mine"]
    assert window.desk.picture.run.frames == 1


def test_what_reading_assumed_is_said_for_loose_files(open_window, run_folder):
    window = open_window(run_folder / "f0.csv")
    assert "taken to" in window.banner.text.text()
    assert not window.desk.picture.notice.grave
    assert "remark" in window.ledger._run_line.detail.text()


def test_a_sample_opens_from_the_start_page(open_window, qtbot):
    window = open_window()
    button = window.findChild(QPushButton, "start.session.sample")
    QTest.mouseClick(button, Qt.MouseButton.LeftButton)
    settle(qtbot, window)
    assert window.desk.picture.run.frames == 48
    assert window.desk.picture.measured_of(window.session.regions[0]).row["circulation"]["value"] > 0
