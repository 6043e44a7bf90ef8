"""Numbers in other units on the screen, the same numbers underneath."""

import pytest

from fieldview.publish.units_shown import powers_of, unit_view
from fieldview.session.models import Reference, RunSource, Session
from tests.gui.conftest import action, settle


@pytest.mark.parametrize(
    ("unit", "powers"),
    [
        ("m^2/s", (2, -1)),
        ("1/s", (0, -1)),
        ("1/s^2", (0, -2)),
        ("px/pulse", (1, -1)),
        ("m", (1, 0)),
        ("1", (0, 0)),
        ("kPa", None),
    ],
)
def test_powers_of_units(unit, powers):
    assert powers_of(unit) == powers


def test_millimetres_and_reference_values():
    session = Session(
        units="m, s", run=RunSource(files=("x.csv",)), reference=Reference(length=0.05, velocity=0.2)
    )
    assert unit_view(session, "mm").of("m^2/s") == (1e6, "mm²/s")
    assert unit_view(session, "mm").of("1/s") == (1.0, "1/s")
    factor, text = unit_view(session, "reference").of("m^2/s")
    assert factor == pytest.approx(1 / (0.05 * 0.2)), "Γ/(UL)"
    assert text == ""
    assert unit_view(session, "reference").of("1/s")[0] == pytest.approx(0.05 / 0.2), "ωL/U"


def test_pixel_sessions_have_no_millimetres():
    session = Session(units="px, pulse", run=RunSource(files=("x.csv",)))
    assert unit_view(session, "mm").of("px") == (1.0, "px")
    assert unit_view(session, "reference").of("px") == (1.0, "px")


def test_the_window_shows_millimetres_everywhere_and_measures_the_same(window, qtbot):
    from fieldview.gui.panels.tables import RAW

    column = window.regions.model.titles.index("Γ [m²/s]")
    before = window.regions.model.index(0, column).data(RAW)
    row = window.desk.picture.measured_of(window.session.regions[0]).row
    action(window, "units.mm").trigger()
    settle(qtbot, window)
    assert window.regions.model.titles[column] == "Γ [mm²/s]"
    assert window.regions.model.index(0, column).data(RAW) == before
    assert float(window.regions.model.rows[0][column].text.replace("+", "").strip()) == pytest.approx(
        1e6 * before, rel=0.02
    )
    assert window.canvas.plot.getAxis("bottom").labelText == "x [mm]"
    assert "mm²/s" in window.canvas.region_layer._regions[0].lines[0]
    assert window.desk.picture.measured_of(window.session.regions[0]).row is row
    assert not action(window, "edit.undo").isEnabled(), "how numbers are shown is no edit"


def test_reference_values_are_set_in_their_sheet(window, qtbot):
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest
    from PySide6.QtWidgets import QLineEdit

    from fieldview.gui.reference_sheet import ReferenceSheet

    action(window, "sheet.reference").trigger()
    sheet = window.findChild(ReferenceSheet)
    for name, text in (("length", "0.02"), ("velocity", "0.1")):
        entry = sheet.findChild(QLineEdit, f"form.{name}")
        QTest.keyClicks(entry, text)
        QTest.keyClick(entry, Qt.Key.Key_Return)
    assert window.session.reference == Reference(length=0.02, velocity=0.1)
    action(window, "units.reference").trigger()
    settle(qtbot, window)
    assert window.canvas.plot.getAxis("left").labelText == "y / L"
    sheet.close()
