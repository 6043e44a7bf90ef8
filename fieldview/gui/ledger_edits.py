"""Edits of the ledger: each makes a new session under a name."""

from __future__ import annotations

from fieldview.session import steps

ADDABLE: tuple[type[steps.Step], ...] = (
    steps.RangeTest,
    steps.MedianTest,
    steps.SpreadTest,
    steps.TimeTest,
    steps.Fill,
    steps.Smooth,
    steps.TurnAxes,
    steps.MovingFrame,
)
"""Steps that make sense with their defaults; masks are drawn, calibration has its own sheet."""


def title_of(model: type[steps.Step]) -> str:
    """``Median test`` for the model of ``median_test``."""
    words = {steps.TurnAxes: "Axes", steps.HandEdit: "By hand"}
    return words.get(model, model.model_fields["step"].default.replace("_", " ").capitalize())


def add(desk, model: type[steps.Step]) -> None:
    """A new line with its defaults, where it belongs in the usual order; its settings open."""
    put(desk, model())


def put(desk, step: steps.Step) -> None:
    session = desk.picture.session
    if session is None:
        return
    ledger = list(session.ledger)
    place = _place_for(step, ledger)
    ledger.insert(place, step)
    _commit(desk, f"Add {title_of(type(step)).lower()}", ledger, line=place)


def by_hand(desk, *, reject=(), keep=()) -> None:
    """Reject or keep single vectors: in the ledger's line for that, or in a new one before any filling."""
    session = desk.picture.session
    ledger = list(session.ledger)
    place = next((i for i, s in enumerate(ledger) if isinstance(s, steps.HandEdit)), None)
    if place is None:
        step = steps.HandEdit()
        place = _place_for(step, ledger)
        ledger.insert(place, step)
    step = ledger[place]
    ledger[place] = step.model_copy(
        update={
            "reject": tuple(sorted((set(step.reject) - set(keep)) | set(reject))),
            "keep": tuple(sorted((set(step.keep) - set(reject)) | set(keep))),
        }
    )
    count = len(reject) + len(keep)
    verb = "Reject" if reject else "Keep"
    _commit(desk, f"{verb} {count} vector{'s' if count > 1 else ''}", ledger)


def _place_for(step: steps.Step, ledger) -> int:
    """Where a new line belongs: axes, frame and masks, tests, edits by hand, filling, smoothing."""
    order = _ORDER.get(type(step), 3)
    later = (i for i, s in enumerate(ledger) if _ORDER.get(type(s), 3) > order)
    return next(later, len(ledger))


_ORDER: dict[type, int] = {
    steps.Calibrate: 0,
    steps.TurnAxes: 1,
    steps.MovingFrame: 2,
    steps.Mask: 2,
    steps.HandEdit: 4,
    steps.Fill: 5,
    steps.Smooth: 6,
}


def switch(desk, line: int, on: bool) -> None:
    step = desk.picture.session.ledger[line]
    if isinstance(step, steps.Calibrate):
        from fieldview.session.convert import set_calibration

        changed = set_calibration(desk.picture.session, step.model_copy(update={"on": on}))
        desk.commit(f"Switch calibration {'on' if on else 'off'}", changed)
        return
    verb = "on" if on else "off"
    change(desk, line, step.model_copy(update={"on": on}), f"Switch {title_of(type(step)).lower()} {verb}")


def change(desk, line: int, step: steps.Step, name: str | None = None) -> None:
    session = desk.picture.session
    if isinstance(step, steps.Calibrate):
        from fieldview.session.convert import set_calibration

        desk.commit(name or "Change the calibration", set_calibration(session, step))
        return
    ledger = list(session.ledger)
    ledger[line] = step
    _commit(desk, name or f"Change {title_of(type(step)).lower()}", ledger)


def remove(desk, line: int) -> None:
    session = desk.picture.session
    step = session.ledger[line]
    if isinstance(step, steps.Calibrate):
        from fieldview.session.convert import set_calibration

        desk.commit("Remove the calibration", set_calibration(session, None))
        return
    ledger = [s for i, s in enumerate(session.ledger) if i != line]
    _commit(desk, f"Remove {title_of(type(step)).lower()}", ledger, line=None)


def move(desk, line: int, by: int) -> None:
    ledger = list(desk.picture.session.ledger)
    place = min(max(line + by, 0), len(ledger) - 1)
    if place == line:
        return
    step = ledger.pop(line)
    ledger.insert(place, step)
    _commit(desk, f"Move {title_of(type(step)).lower()}", ledger, line=place)


def as_of(desk, line: int) -> None:
    """Show the field as of this line; at the last line, or once more, the mark goes away."""
    count = line + 1
    ledger = desk.picture.session.ledger
    same = desk.picture.shown.as_of == count
    desk.show(as_of=None if same or count == len(ledger) else count)


def _commit(desk, name: str, ledger, **shown) -> None:
    from fieldview.compute.errors import InputError
    from fieldview.gui.desk import checked

    try:
        session = checked(desk.picture.session, ledger=tuple(ledger))
    except InputError as error:
        sentence = str(error)
        desk.complain(f"{sentence[:1].upper()}{sentence[1:]}.")
        return
    desk.commit(name, session, **shown)
