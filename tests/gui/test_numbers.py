"""The window shows the very numbers that the command line prints."""

import json

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QTableView

from fieldview.gui.panels.tables import RAW
from fieldview.session.measure import measure
from fieldview.session.regions import Line, Polygon
from tests.gui.conftest import action, drag, key, settle


def with_more_regions(window, qtbot):
    session = window.session
    more = (
        Polygon(name="box", points=((0.02, 0.01), (0.06, 0.012), (0.055, 0.05), (0.018, 0.044))),
        Line(name="cut", points=((0.07, 0.005), (0.07, 0.055))),
    )
    window.desk.edit("Add two", regions=(*session.regions, *more))
    settle(qtbot, window)


def shown_rows(window) -> list[dict]:
    picture = window.desk.picture
    return [picture.measured_of(region).row for region in picture.regions]


def test_rows_equal_measure_exactly(window, qtbot):
    with_more_regions(window, qtbot)
    for frame in (0, 2):
        window.desk.go_to(frame)
        settle(qtbot, window)
        printed = measure(window.session, frames=[frame])[0]["regions"]
        assert json.dumps(shown_rows(window)) == json.dumps(printed)


def test_rows_equal_measure_after_edits_by_mouse(window, qtbot):
    action(window, "tool.circle").trigger()
    drag(window, (0.04, 0.03), (0.055, 0.035))
    drag(window, (0.04, 0.03), (0.042, 0.028))
    window.ledger.lines[1].switch.click()
    settle(qtbot, window)
    printed = measure(window.session, frames=[0])[0]["regions"]
    assert json.dumps(shown_rows(window)) == json.dumps(printed)


def test_the_table_holds_the_bare_values_and_their_uncertainty(window, qtbot):
    with_more_regions(window, qtbot)
    table = window.regions.findChild(QTableView)
    model = table.model()
    titles = [model.headerData(c, Qt.Orientation.Horizontal) for c in range(model.columnCount())]
    printed = measure(window.session, frames=[0])[0]["regions"]
    gamma = titles.index("Γ [m²/s]")
    for row, region in enumerate(printed):
        number = region["circulation"] if region["closed"] else region["line_integral"]
        assert model.index(row, gamma).data(RAW) == number["value"]
        assert model.index(row, gamma + 1).data(RAW) == number["uncertainty"]["combined"]
    window.desk.show(coverage=2.0)
    assert model.index(0, gamma + 1).data(RAW) == 2 * printed[0]["circulation"]["uncertainty"]["combined"]
    assert "k = 2" in window.regions._said.text()


def test_values_smaller_than_their_uncertainty_are_muted_not_hidden(window, qtbot):
    settle(qtbot, window)
    rows, titles = window.regions.model.rows, window.regions.model.titles
    for column, title in enumerate(titles[:-1]):
        if titles[column + 1] == "± U":
            value, spread = rows[0][column].value, rows[0][column + 1].value
            assert rows[0][column].muted == (abs(value) < spread), title
            assert rows[0][column].text


def test_the_label_beside_the_region_says_the_same(window, qtbot):
    from fieldview.publish import wording

    settle(qtbot, window)
    number = measure(window.session, frames=[0])[0]["regions"][0]["circulation"]
    expected = wording.plus_minus(
        number["value"], number["uncertainty"]["combined"], number["unit"], signed=True
    )
    lines = window.canvas.region_layer._regions[0].lines
    assert lines[0] == f"Γ  {expected}"


def test_an_unmeasurable_region_says_why(window, qtbot):
    window.desk.edit(
        "Add", regions=(*window.session.regions, Polygon(name="off", points=((1, 1), (1.1, 1), (1, 1.1))))
    )
    settle(qtbot, window)
    row = shown_rows(window)[1]
    assert row["circulation"]["value"] is None
    cautions = window.regions.model.rows[1][-1]
    assert cautions.text == row["warnings"][0] or cautions.text.startswith(row["warnings"][0])


def test_undoing_everything_restores_the_first_session(window, qtbot):
    first = window.session
    action(window, "tool.rectangle").trigger()
    drag(window, (0.02, 0.01), (0.05, 0.04))
    key(window, Qt.Key.Key_Delete)
    window.ledger.lines[0].switch.click()
    window.quantities.scheme.setCurrentIndex(2)
    window.quantities.scheme.activated.emit(2)
    action(window, "line.cubic").trigger()
    settle(qtbot, window)
    last = window.session
    steps = 0
    while action(window, "edit.undo").isEnabled():
        action(window, "edit.undo").trigger()
        steps += 1
    assert steps == 5
    assert window.session == first
    while action(window, "edit.redo").isEnabled():
        action(window, "edit.redo").trigger()
    assert window.session == last
