"""Whatever is done: the window shows what measure prints, and undoing everything gives the first session."""

import json

from hypothesis import HealthCheck, Phase, given, settings
from hypothesis import strategies as st

from fieldview.gui import ledger_edits
from fieldview.session.measure import measure
from fieldview.session.regions import Circle, Rectangle
from fieldview.session.steps import Smooth, SpreadTest
from tests.gui.conftest import action, drag, settle

PLACES = st.sampled_from([(0.02, 0.02), (0.03, 0.04), (0.05, 0.03), (0.06, 0.02)])


def draw_circle(window, place, size):
    region = Circle(name=window.desk.free_name("circle"), centre=place, radius=0.004 + 0.003 * size)
    window.desk.add_region(region)


def draw_rectangle(window, place, size):
    far = (place[0] + 0.004 + 0.002 * size, place[1] + 0.006)
    window.desk.add_region(Rectangle(name=window.desk.free_name("rectangle"), corners=(place, far)))


def drag_rim(window, place, size):
    action(window, "tool.move").trigger()
    window.desk.show(selected=window.session.regions[0].name if window.session.regions else None)
    region = window.desk.picture.selected
    if region is not None and region.shape == "circle":
        top = (region.centre[0], region.centre[1] + region.radius)
        drag(window, top, (top[0], top[1] - 0.002 - 0.001 * size))


def switch_line(window, place, size):
    if window.session.ledger:
        line = size % len(window.session.ledger)
        ledger_edits.switch(window.desk, line, not window.session.ledger[line].on)


def add_step(window, place, size):
    ledger_edits.put(window.desk, SpreadTest(limit=4.0 + size) if size % 2 else Smooth())


def remove_step(window, place, size):
    if window.session.ledger:
        ledger_edits.remove(window.desk, size % len(window.session.ledger))


def change_scheme(window, place, size):
    names = ("central", "richardson", "least_squares", "circulation")
    window.desk.edit("Change the derivative scheme", derivative=names[size % 4])


def change_line(window, place, size):
    action(window, "line.cubic").trigger()


def delete_region(window, place, size):
    if window.session.regions:
        window.desk.show(selected=window.session.regions[size % len(window.session.regions)].name)
        action(window, "region.delete").trigger()


def undo(window, place, size):
    window.desk.undo()


def redo(window, place, size):
    window.desk.redo()


def step_frame(window, place, size):
    window.desk.go_to(size % 4)


COMMANDS = st.sampled_from(
    [
        draw_circle,
        draw_rectangle,
        drag_rim,
        switch_line,
        add_step,
        remove_step,
        change_scheme,
        change_line,
        delete_region,
        undo,
        redo,
        step_frame,
    ]
)


@settings(
    max_examples=8,
    deadline=None,
    database=None,
    phases=(Phase.explicit, Phase.generate),  # every try takes a whole window: no time for shrinking
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(commands=st.lists(st.tuples(COMMANDS, PLACES, st.integers(0, 7)), min_size=3, max_size=8))
def test_any_commands_are_measured_truly_and_undone_wholly(window, qtbot, commands):
    window.desk.go_to(0)
    first = window.session
    for command, place, size in commands:
        command(window, place, size)
    settle(qtbot, window)
    picture = window.desk.picture
    assert picture.notice is None, picture.notice
    shown = [picture.measured_of(region).row for region in picture.regions]
    printed = measure(window.session, frames=[picture.shown.frame])[0]["regions"]
    assert json.dumps(shown) == json.dumps(printed)
    while action(window, "edit.undo").isEnabled():
        action(window, "edit.undo").trigger()
    assert window.session == first
    settle(qtbot, window)
