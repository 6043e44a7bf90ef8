"""The sheets on the whole run: what they show is what the headless functions give."""

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QImage
from PySide6.QtTest import QTest

from fieldview.gui.figure_sheet import FigureSheet
from fieldview.gui.sheets import Sheet
from fieldview.publish import wording
from fieldview.session.check import run_check
from fieldview.session.replay import Workbench
from fieldview.session.statistics import run_statistics
from fieldview.session.store import load_session, save_session
from fieldview.session.traces import region_trace, trace_row
from tests.gui.conftest import action, settle
from tests.session.runs import PHASES, SIGMA, edited, pulsing_frames


@pytest.fixture(scope="module")
def pulse_file(tmp_path_factory):
    folder = tmp_path_factory.mktemp("pulse")
    reference = {"length": 0.01, "velocity": 0.1, "length_name": "core"}
    ledger = [{"step": "median_test", "floor": SIGMA}, {"step": "fill"}]
    session = edited(pulsing_frames(folder, 2), reference=reference, ledger=ledger, title="pulse")
    save_session(session, folder / "pulse.session.json")
    return folder / "pulse.session.json"


@pytest.fixture
def pulse(open_window, pulse_file):
    window = open_window(pulse_file)
    yield window
    for sheet in window.findChildren(Sheet):
        sheet.close()


def opened(window, id: str) -> Sheet:
    before = set(window.findChildren(Sheet))
    action(window, id).trigger()
    (sheet,) = set(window.findChildren(Sheet)) - before
    assert not sheet.isModal()
    return sheet


def started(window, qtbot, sheet: Sheet) -> None:
    QTest.mouseClick(sheet.begin, Qt.MouseButton.LeftButton)
    settle(qtbot, window)


def test_the_run_check_shows_every_verdict(pulse, qtbot, pulse_file):
    sheet = opened(pulse, "study.check")
    settle(qtbot, pulse)
    wanted = run_check(Workbench(load_session(pulse_file)))
    shown = [label.text() for label in sheet.findings.findChildren(type(sheet.range), "verdict")]
    assert shown == [row["verdict"] for row in wanted.rows()]
    np.testing.assert_array_equal(sheet._found.rejected, wanted.rejected)
    assert f"{len(wanted.frames)} frames looked at" in sheet.problem.text()
    sheet.choice.setCurrentIndex(1)
    sheet.choice.activated.emit(1)
    assert "colours from 0" in sheet.range.text()


def test_a_region_over_time_with_its_spectrum(pulse, qtbot, pulse_file):
    sheet = opened(pulse, "study.over_time")
    assert sheet.what.currentData() == "core" and sheet.number.currentData() == "circulation"
    started(pulse, qtbot, sheet)
    bench = Workbench(load_session(pulse_file))
    trace = region_trace(bench, "core")
    np.testing.assert_array_equal(sheet._found.trace.values, trace.values)
    main = trace_row(trace)["dominant_frequency"]
    told = sheet.told.toPlainText()
    assert wording.plus_minus(main["value"], main["uncertainty"], main["unit"]) in told
    assert "Strouhal number" in told and "on the core" in told
    for page in range(4):
        sheet.tabs.setCurrentIndex(page)
        lines = [item for item in sheet.plot.getPlotItem().listDataItems() if item.xData is not None]
        assert any(np.isfinite(item.yData).any() for item in lines)
    sheet.tabs.setCurrentIndex(3)
    bands = [item for item in sheet.plot.getPlotItem().items if type(item).__name__ == "FillBetweenItem"]
    assert bands and not bands[0].path().isEmpty(), "the band of the uncertainty is drawn"


def test_a_probe_needs_a_place_and_a_place_on_the_grid(pulse, qtbot):
    sheet = opened(pulse, "study.over_time")
    sheet.what.setCurrentIndex(0)
    sheet.what.activated.emit(0)
    sheet.place[0].setText("here")
    started(pulse, qtbot, sheet)
    assert "two numbers" in sheet.problem.text()
    sheet.place[0].setText("7")
    started(pulse, qtbot, sheet)
    assert "outside the grid" in sheet.problem.text()
    sheet.place[0].setText("0.025")
    started(pulse, qtbot, sheet)
    assert "speed at" in sheet.told.toPlainText()


def test_statistics_are_maps_with_their_uncertainty(pulse, qtbot, pulse_file):
    sheet = opened(pulse, "study.statistics")
    settle(qtbot, pulse)
    wanted = run_statistics(Workbench(load_session(pulse_file))).maps()
    assert list(sheet._found.maps) == list(wanted)
    name = sheet.choice.currentData()
    np.testing.assert_array_equal(sheet._found.maps[name].values, wanted[name].values)
    before = sheet.told.toPlainText()
    QTest.mouseClick(sheet.spread, Qt.MouseButton.LeftButton)
    assert sheet.told.toPlainText() != before and "median" in sheet.told.toPlainText()


def test_modes_and_a_frame_made_of_them(pulse, qtbot):
    sheet = opened(pulse, "study.modes")
    started(pulse, qtbot, sheet)
    assert "mode 1: energy" in sheet.told.toPlainText() and "45 %" not in sheet.told.toPlainText()
    sheet.view.setCurrentIndex(1)
    sheet.view.activated.emit(1)
    assert "from the mean and 1 modes" in sheet.told.toPlainText()


def test_two_point_correlation(pulse, qtbot):
    sheet = opened(pulse, "study.correlation")
    started(pulse, qtbot, sheet)
    assert f"{2 * PHASES} frames" in sheet.told.toPlainText() and "+x:" in sheet.told.toPlainText()


def test_choices_are_tabled(pulse, qtbot):
    sheet = opened(pulse, "study.choices")
    started(pulse, qtbot, sheet)
    assert sheet.rows.rowCount() == 4 and sheet.rows.rows[0][0].text == "Γ"
    assert "672 combinations on frame 1" in sheet.told.toPlainText()


def test_a_study_can_be_cancelled(pulse, qtbot):
    sheet = opened(pulse, "study.choices")
    QTest.mouseClick(sheet.begin, Qt.MouseButton.LeftButton)
    assert sheet.stop.isEnabled() and not sheet.begin.isEnabled()
    QTest.mouseClick(sheet.stop, Qt.MouseButton.LeftButton)
    settle(qtbot, pulse)
    assert sheet.begin.isEnabled() and sheet.rows.rowCount() == 0


def test_the_figure_has_a_true_preview_and_its_settings_are_undone(pulse, qtbot, tmp_path):
    sheet = opened(pulse, "output.figure")
    assert isinstance(sheet, FigureSheet)
    qtbot.waitUntil(lambda: not sheet.preview.pixmap().isNull(), timeout=20_000)
    settle(qtbot, pulse)
    wide = sheet.preview.pixmap().width()
    first = pulse.session
    entry = sheet.form.findChild(type(sheet.form._entries["width_mm"].parts[0]), "form.width_mm")
    entry.setFocus()
    entry.selectAll()
    QTest.keyClicks(entry, "120")
    QTest.keyClick(entry, Qt.Key.Key_Return)
    assert pulse.session.figures[0].width_mm == 120
    qtbot.waitUntil(lambda: sheet.preview.pixmap().width() > wide, timeout=20_000)
    settle(qtbot, pulse)
    sheet.write(str(tmp_path / "f.pdf"))
    settle(qtbot, pulse)
    assert (tmp_path / "f.pdf").read_bytes().startswith(b"%PDF")
    assert "sha256:" in (tmp_path / "f.txt").read_text()
    assert "f.pdf and its caption" in sheet.problem.text()
    action(pulse, "edit.undo").trigger()
    assert pulse.session == first


def test_the_report_is_written_in_the_background(pulse, qtbot, tmp_path):
    pulse.desk.report(tmp_path / "r.html")
    settle(qtbot, pulse)
    assert "<h2>Regions</h2>" in (tmp_path / "r.html").read_text()
    assert "r.html was written" in pulse.banner.text.text()


def test_the_run_is_kept_and_read_from_its_store(pulse, qtbot, pulse_file):
    values = pulse.desk.picture.field.u.copy()
    action(pulse, "run.store").trigger()
    settle(qtbot, pulse)
    assert (
        pulse.session.run.store == "pulse.store.h5"
        and "is kept in pulse.store.h5" in pulse.banner.text.text()
    )
    assert type(pulse.desk.bench.run).__name__ == "StoredRun"
    np.testing.assert_array_equal(pulse.desk.picture.field.u, values)
    action(pulse, "edit.undo").trigger()
    settle(qtbot, pulse)
    assert pulse.session.run.store is None


def test_the_preview_is_a_picture(pulse, qtbot):
    from fieldview.gui.studies.work import figure_preview
    from fieldview.session.figures import FigureSettings

    made = figure_preview(pulse.desk.bench, pulse.session, FigureSettings(), lambda share: None)
    assert QImage.fromData(made).width() > 200


def test_phase_averages_need_their_source_and_show_every_bin(pulse, qtbot):
    sheet = opened(pulse, "study.phase")
    started(pulse, qtbot, sheet)
    assert "State a frequency" in sheet.problem.text()
    entry = sheet.form._entries["frequency"].parts[0]
    entry.setFocus()
    entry.selectAll()
    QTest.keyClicks(entry, "2")
    QTest.keyClick(entry, Qt.Key.Key_Return)
    assert pulse.session.phase.frequency == 2.0
    started(pulse, qtbot, sheet)
    assert [row[2].text for row in sheet.rows.rows] == ["2"] * 8
    wanted = Workbench(pulse.session).field("phase:8:0")
    np.testing.assert_array_equal(sheet._found.fields[0].u, wanted.u)
    assert "core: Γ" in sheet.told.toPlainText() and "phase 0°" in sheet.told.toPlainText()
    sheet.shown.setValue(4)
    assert "phase 180°" in sheet.told.toPlainText()


def test_frames_are_compared(pulse, qtbot, pulse_file):
    sheet = opened(pulse, "study.compare")
    sheet.frame.setText("4")
    started(pulse, qtbot, sheet)
    first, second = (Workbench(load_session(pulse_file)).field(frame) for frame in (0, 4))
    np.testing.assert_array_equal(sheet._found.difference.u, second.u - first.u)
    assert sheet.rows.rows[0][0].text == "core" and sheet.rows.rows[0][5].text == "yes"
    assert "beyond 2 u" in sheet.told.toPlainText()
    sheet.take(str(pulse_file))
    sheet.frame.setText("0")
    started(pulse, qtbot, sheet)
    assert sheet.rows.rows[0][5].text == "no" and sheet.source.text() == "pulse.session.json"
    sheet.frame.setText("99")
    started(pulse, qtbot, sheet)
    assert "the run has 16 frames" in sheet.problem.text()


def test_help_is_there_for_every_sheet(pulse, qtbot):
    from fieldview.gui.help import topic_of

    sheet = opened(pulse, "study.compare")
    assert topic_of(sheet.frame) == "comparison_sheet"


def test_repeats_are_judged(pulse, qtbot, pulse_file):
    sheet = opened(pulse, "study.repeats")
    sheet.frames.setText("0:16:8")
    started(pulse, qtbot, sheet)
    assert "give at least 3" in sheet.problem.text()
    sheet.frames.setText("0:")
    started(pulse, qtbot, sheet)
    assert sheet.rows.rows[0][0].text == "core" and sheet.rows.rows[0][6].text == "16"
    assert "core, Γ: scatters more than stated" in sheet.told.toPlainText(), "the pulse is no repeat"
    sheet.take([str(pulse_file), str(pulse_file)])
    started(pulse, qtbot, sheet)
    assert "scatters less than stated" in sheet.told.toPlainText(), "one and the same run three times"


def test_a_place_that_cannot_be_written_is_one_sentence(pulse, qtbot, tmp_path):
    pulse.desk.report(tmp_path / "nowhere" / "r.html")
    settle(qtbot, pulse)
    assert "r.html: cannot be written (No such file or directory)" in pulse.banner.text.text()
