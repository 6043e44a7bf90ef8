"""Factors from a file's units to the program's, and the questions where a unit is not said."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from fieldview.compute.errors import InputError
from fieldview.compute.units import METRIC, PIXEL, Units
from fieldview.files.contents import Contents
from fieldview.files.reading import Reading
from fieldview.files.roles import Question
from fieldview.files.units import Unit, parse_unit


@dataclass(frozen=True)
class Scales:
    """What the numbers of a file are multiplied by.

    Attributes
    ----------
    units : Units
        What they are in then.
    x, y : float
    flow : mapping of role (u, v, w, speed) to float
    sigma : mapping of component to float
    time : float
        [s]
    angle : float
        Of a direction. [rad]
    written : mapping of role to str
        The units as the file or the answers say them.
    notes : tuple of str
    """

    units: Units
    x: float
    y: float
    flow: Mapping[str, float]
    sigma: Mapping[str, float]
    time: float
    angle: float
    written: Mapping[str, str]
    notes: tuple[str, ...] = ()


def find_scales(
    contents: Contents, roles: Mapping[str, str], reading: Reading
) -> tuple[Scales | None, list[Question]]:
    """The factors, or None and what must be asked.

    Raises InputError where a unit is none of a length, a velocity or a displacement, or the units do not
    fit each other.
    """
    name = contents.path.name
    questions: list[Question] = []
    notes: list[str] = []
    written: dict[str, str] = {}
    flow_roles = [role for role in ("u", "v", "w", "speed") if role in roles]

    def unit_of(role: str, answer: str | None) -> Unit | None:
        said = contents[roles[role]].unit
        text = answer if answer is not None else said
        if text is None or (answer is None and not text.strip()):
            return None
        written[role] = text
        try:
            unit = parse_unit(text)
            if answer is not None and said and parse_unit(said) != unit:
                notes.append(f'"{roles[role]}" says {said}, but is read in {answer} as the reading says')
        except InputError as error:
            raise InputError(f'{name}: the unit of "{roles[role]}": {error}') from None
        return unit

    lengths = {role: unit_of(role, reading.length_unit) for role in ("x", "y")}
    flows = {role: unit_of(role, reading.velocity_unit) for role in flow_roles}
    for key, found, what in (
        ("length_unit", lengths, "the positions"),
        ("velocity_unit", flows, "the velocities"),
    ):
        unsaid = [f'"{roles[role]}"' for role, unit in found.items() if unit is None]
        if unsaid:
            kinds = "mm, m or px" if key == "length_unit" else "m/s, mm/s or px"
            verb = "is" if len(unsaid) == 1 else "are"
            questions.append(
                Question(
                    key, f"say under {key} in what {what} {' and '.join(unsaid)} {verb}, such as {kinds}"
                )
            )
    for role, unit in lengths.items():
        if unit is not None and unit.kind not in ("length", "pixel"):
            raise InputError(
                f'{name}: "{roles[role]}" is in {written[role]}, which is no length; '
                "give length_unit, such as mm"
            )
    for role, unit in flows.items():
        if unit is not None and unit.kind not in _FLOW_KINDS:
            raise InputError(
                f'{name}: "{roles[role]}" is in {written[role]}, which is neither a velocity nor a '
                "displacement; give velocity_unit, such as m/s or px"
            )
    if questions:
        return None, questions
    pixels = {unit.kind == "pixel" for unit in lengths.values()}
    if len(pixels) > 1:
        raise InputError(f"{name}: x and y are not both in pixels; give length_unit for both")
    units = PIXEL if pixels.pop() else METRIC
    factors = {}
    for role, unit in flows.items():
        factor, question = _flow_factor(unit, units, reading, name, roles[role], written[role])
        if question is not None and question not in questions:
            questions.append(question)
        factors[role] = factor
    if reading.vector_position == "first_image" and units is METRIC and reading.pulse_separation is None:
        questions.append(_PULSE)
    sigma = {}
    for component in ("u", "v", "w"):
        role = f"sigma_{component}"
        if role in roles and component in factors:
            own = contents[roles[role]].unit
            unit = (
                parse_unit(own) if own and own.strip() and reading.velocity_unit is None else flows[component]
            )
            sigma[component], _ = _flow_factor(unit, units, reading, name, roles[role], own or "")
    time = _time_factor(contents, roles, reading, questions, name)
    if questions:
        return None, questions
    if units is PIXEL and reading.pulse_separation is not None and all(
        unit.kind in ("pixel", "pixel velocity") for unit in flows.values()
    ):  # fmt: skip
        notes.append(
            "pulse_separation is not used for displacements in pixels; "
            "a calibrate line of the ledger states its own"
        )
    angle = _angle_factor(contents, roles, notes)
    return (
        Scales(
            units,
            lengths["x"].factor,
            lengths["y"].factor,
            factors,
            sigma,
            time,
            angle,
            written,
            tuple(notes),
        ),
        [],
    )


_FLOW_KINDS = ("velocity", "length", "pulse velocity", "pixel", "pixel velocity", "pixel rate")
_PULSE = Question(
    "pulse_separation",
    "say under pulse_separation the time between the two pulses in s (not the frame interval)",
)


def _flow_factor(
    unit: Unit, units: Units, reading: Reading, name: str, column: str, written: str
) -> tuple[float, Question | None]:
    in_pixels = unit.kind.startswith("pixel")
    if in_pixels and units is METRIC:
        raise InputError(
            f'{name}: "{column}" is in {written}, but the positions are in a length; '
            'give velocity_unit as the size of a pixel, such as "0.1 mm", and the pulse_separation'
        )
    if not in_pixels and units is PIXEL:
        raise InputError(
            f'{name}: "{column}" is in {written}, but the positions are in pixels; '
            'give length_unit as the size of a pixel, such as "0.1 mm"'
        )
    if unit.kind in ("velocity", "pixel", "pixel velocity"):
        return unit.factor, None
    if reading.pulse_separation is None:
        return 1.0, _PULSE
    if unit.kind == "pixel rate":
        return unit.factor * reading.pulse_separation, None
    return unit.factor / reading.pulse_separation, None


def _time_factor(contents, roles, reading: Reading, questions: list[Question], name: str) -> float:
    if "time" not in roles:
        return 1.0
    text = reading.time_unit or contents[roles["time"]].unit
    if text is None or not text.strip():
        questions.append(
            Question("time_unit", f'say under time_unit in what "{roles["time"]}" is, such as s or ms')
        )
        return 1.0
    # CF writes "seconds since 2020-01-01"; only differences of time matter here
    unit = parse_unit(text.split(" since ")[0])
    if unit.kind != "time":
        raise InputError(
            f'{name}: "{roles["time"]}" is in {text}, which is no time; give time_unit, such as s'
        )
    return unit.factor


def _angle_factor(contents, roles, notes: list[str]) -> float:
    degree = 3.141592653589793 / 180
    if "direction" not in roles:
        return degree
    text = contents[roles["direction"]].unit
    if not text or not text.strip():
        notes.append("the direction is taken to be in degrees")
        return degree
    unit = parse_unit(text)
    return unit.factor if unit.kind == "angle" else degree
