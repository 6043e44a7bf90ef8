"""What leaves the window: session, field, picture, table."""

import csv
import io

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication, QImage
from PySide6.QtWidgets import QFileDialog

from fieldview.gui import dialogs
from fieldview.session.measure import measure
from fieldview.session.store import load_session
from tests.gui.conftest import action, drag, settle


def test_saving_writes_what_measures_the_same(window, session_file, qtbot):
    action(window, "tool.circle").trigger()
    drag(window, (0.04, 0.03), (0.05, 0.035))
    assert window.desk.picture.unsaved
    action(window, "session.save").trigger()
    settle(qtbot, window)
    assert not window.desk.picture.unsaved
    stored = load_session(session_file)
    assert stored.regions == window.session.regions
    assert set(stored.run.digests) == {f"run/f{i}.csv" for i in range(4)}
    assert measure(stored, frames=[0]) == measure(window.session, frames=[0])


def test_how_it_was_looked_at_is_kept_with_the_session(window, session_file, qtbot, open_window):
    action(window, "map.divergence").trigger()
    window.desk.go_to(2)
    settle(qtbot, window)
    action(window, "session.save").trigger()
    settle(qtbot, window)
    again = open_window(session_file)
    assert again.desk.picture.shown.quantity == "divergence"
    assert again.desk.picture.field_frame == 2


def test_a_run_without_a_session_file_asks_for_a_name(open_window, run_folder, qtbot):
    window = open_window(run_folder)
    action(window, "session.save").trigger()
    dialog = window.findChild(QFileDialog)
    assert dialog is not None and not dialog.isHidden()
    target = run_folder.parent / "named"
    dialog.fileSelected.emit(str(target))
    dialog.close()
    settle(qtbot, window)
    assert load_session(run_folder.parent / "named.session.json").run.files == ("run",)
    assert window.desk.picture.path.name == "named.session.json"


def test_a_place_that_cannot_be_written_is_explained(window, qtbot, tmp_path):
    before = window.session
    window.desk.save(tmp_path / "no" / "such" / "x.session.json")
    settle(qtbot, window)
    assert "cannot be written" in window.banner.text.text()
    assert window.session == before


@pytest.mark.parametrize("ending", [".csv", ".nc", ".npz"])
def test_the_cleaned_field_is_exported_and_read_back(window, qtbot, tmp_path, ending):
    from fieldview.files import open_run

    field = window.desk.picture.field
    window.desk.export(tmp_path / f"out{ending}")
    settle(qtbot, window)
    back = open_run((f"out{ending}",), folder=tmp_path)[0]
    np.testing.assert_array_equal(back.u, field.u)
    np.testing.assert_array_equal(back.status, field.status)


def test_an_unknown_ending_is_refused(window, qtbot, tmp_path):
    window.desk.export(tmp_path / "out.doc")
    settle(qtbot, window)
    assert ".csv, .nc, .npz" in window.banner.text.text()
    assert not list(tmp_path.glob("out*"))


def test_the_canvas_is_saved_as_a_picture(window, tmp_path):
    path = tmp_path / "canvas.png"
    dialogs.save_picture(window, path)
    image = QImage(str(path))
    assert image.width() == 2 * window.canvas.viewport().width()
    colours = {image.pixel(x, image.height() // 2) for x in range(0, image.width(), 3)}
    assert len(colours) > 12


def test_the_table_goes_to_the_clipboard_and_to_csv(window, qtbot, tmp_path):
    settle(qtbot, window)
    action(window, "regions.copy").trigger()
    lines = QGuiApplication.clipboard().text().splitlines()
    assert lines[0].split("\t")[0] == "region"
    assert lines[1].split("\t")[0] == "core"
    dialogs.write_regions(window, tmp_path / "regions.csv")
    row = next(csv.DictReader(io.StringIO((tmp_path / "regions.csv").read_text())))
    printed = measure(window.session, frames=[0])[0]["regions"][0]
    assert float(row["circulation"]) == printed["circulation"]["value"]
    assert float(row["circulation_u_combined"]) == printed["circulation"]["uncertainty"]["combined"]
    assert row["circulation_unit"] == "m^2/s"


def test_csv_text_is_never_taken_for_a_formula():
    from fieldview.publish.tables import plain_text

    assert plain_text("=1+1") == "'=1+1"
    assert plain_text("core") == "core"


def test_dialogs_do_not_block(window):
    for id in ("session.open", "session.open_folder", "export.field", "export.picture"):
        action(window, id).trigger()
    dialogs_open = window.findChildren(QFileDialog)
    assert len(dialogs_open) == 4
    for dialog in dialogs_open:
        dialog.close()
    assert window.windowModality() == Qt.WindowModality.NonModal
