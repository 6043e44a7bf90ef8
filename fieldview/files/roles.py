"""Which column is what: by the user's word, by CF standard names, by the names in use."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass

from fieldview.compute.errors import InputError
from fieldview.files.contents import Contents, Variable
from fieldview.files.reading import ROLES, Reading

NAMES = {
    "x": "x xcoordinate xposition xpos",
    "y": "y ycoordinate yposition ypos",
    "u": "u ux vx xvelocity velocityx uvelocity velocityu dx xdisplacement displacementx",
    "v": "v uy vy yvelocity velocityy vvelocity velocityv dy ydisplacement displacementy",
    "w": "w uz vz zvelocity velocityz wvelocity velocityw dz zdisplacement displacementz",
    "speed": "speed windspeed flowspeed",
    "direction": "direction dir winddirection flowdirection",
    "time": "time t",
    "frame": "frame frameno framenumber frameindex",
    "sigma_u": "sigmau usigma uuncertainty uncertaintyu",
    "sigma_v": "sigmav vsigma vuncertainty uncertaintyv",
    "sigma_w": "sigmaw wsigma wuncertainty uncertaintyw",
}
"""Names in use (common practice, no source), in small letters, without signs and blanks."""

STANDARD_NAMES = {
    "projection_x_coordinate": "x",
    "projection_y_coordinate": "y",
    "eastward_wind": "u",
    "northward_wind": "v",
    "x_wind": "u",
    "y_wind": "v",
    "upward_air_velocity": "w",
    "sea_water_x_velocity": "u",
    "sea_water_y_velocity": "v",
    "eastward_sea_water_velocity": "u",
    "northward_sea_water_velocity": "v",
    "upward_sea_water_velocity": "w",
    "wind_speed": "speed",
    "wind_from_direction": "direction",
    "wind_to_direction": "direction",
    "time": "time",
}
"""CF standard names (CF standard name table; from memory) and the role they give."""

GLOBE = ("longitude", "latitude", "grid_longitude", "grid_latitude")

_ROLE_OF = {name: role for role, names in NAMES.items() for name in names.split()}


@dataclass(frozen=True)
class Question:
    """Something a file does not say that must be known: the key of ``reading`` that answers it."""

    key: str
    sentence: str


class NeedsAnswer(InputError):
    """A file does not say something necessary.

    Attributes
    ----------
    questions : tuple of Question
    """

    def __init__(self, name: str, questions: Iterable[Question]):
        self.questions = tuple(questions)
        super().__init__(f"{name}: " + "; ".join(question.sentence for question in self.questions))


def find_roles(contents: Contents, reading: Reading) -> tuple[dict[str, str], list[Question]]:
    """Name of the variable behind each role, and what must be asked.

    Raises InputError where the reading names a column that the file does not have, or the axes are
    longitude and latitude.
    """
    names = [variable.name for variable in contents.variables]
    ignored = {_named(contents, entry, "ignore") for entry in reading.ignore}
    given = {}
    for role, entry in reading.columns.items():
        if role not in ROLES:
            raise InputError(f'columns: "{role}" is no role; use one of {", ".join(ROLES)}')
        given[role] = _named(contents, entry, f"columns.{role}")
    taken = set(given.values()) | ignored
    roles, questions = dict(given), []
    candidates: dict[str, list[str]] = {}
    for variable in contents.variables:
        role = _role_of(variable)
        if variable.name not in taken and role is not None and role not in given:
            candidates.setdefault(role, []).append(variable.name)
    for role, found in candidates.items():
        exact = [name for name in found if name == role] or [n for n in found if n.lower() == role]
        best = found if len(found) == 1 else exact
        if len(best) == 1:
            roles[role] = best[0]
        else:
            listed = " or ".join(f'"{name}"' for name in found)
            questions.append(Question("columns", f"say under columns which is {role}: {listed}"))
    _refuse_globe(contents, roles)
    if {"u", "v"} & roles.keys():
        # beside components they are derived from them
        for role in ("speed", "direction"):
            if role not in given:
                roles.pop(role, None)
    asked = {question.sentence.split(":")[0].split()[-1] for question in questions}
    missing = [role for role in ("x", "y") if role not in roles and role not in asked]
    has_flow = {"u", "v", "w", "speed"} & (roles.keys() | asked)
    if missing or not has_flow:
        wanted = missing + ([] if has_flow else ["u, v or w"])
        listed = ", ".join(f'"{name}"' for name in names[:12]) + (" ..." if len(names) > 12 else "")
        questions.append(
            Question("columns", f"say under columns which is {' and '.join(wanted)}; the file has {listed}")
        )
    if "direction" in roles and "speed" not in roles and not {"u", "v"} & roles.keys():
        questions.append(Question("columns", "say under columns which is the speed of the direction"))
    return roles, questions


def _named(contents: Contents, entry: str | int, key: str) -> str:
    """Name of the variable meant by a name or a number counted from 0."""
    names = [variable.name for variable in contents.variables]
    if isinstance(entry, int):
        if entry >= len(names):
            raise InputError(
                f"{contents.path.name}: {key} is column {entry}, "
                f"but the file has columns 0 to {len(names) - 1}"
            )
        return names[entry]
    same = [name for name in names if name == entry] or [n for n in names if n.lower() == entry.lower()]
    if len(same) != 1:
        listed = ", ".join(f'"{name}"' for name in names[:12])
        raise InputError(f'{contents.path.name}: {key} is "{entry}", but the file has {listed}')
    return same[0]


def _role_of(variable: Variable) -> str | None:
    standard = STANDARD_NAMES.get(variable.standard_name or "")
    if standard is not None:
        return standard
    if variable.attributes.get("role") in ROLES:
        return variable.attributes["role"]
    last = re.split(r"[/.]", variable.name)[-1]
    return _ROLE_OF.get(re.sub(r"[^a-z0-9]", "", last.lower()))


def _refuse_globe(contents: Contents, roles: dict[str, str]) -> None:
    positions = {roles.get("x"), roles.get("y")}
    for variable in contents.variables:
        degrees = (variable.unit or "").replace("_", " ").replace("degrees", "degree").lower()
        globe = variable.standard_name in GLOBE or variable.name.lower() in GLOBE
        globe = globe or degrees.startswith(("degree north", "degree east"))
        if globe and (variable.name in positions or None in positions):
            raise InputError(
                f'{contents.path.name}: "{variable.name}" is a longitude or latitude; project the '
                "positions to a plane in metres first"
            )
