"""How files would be read, found out in the background for the reading sheet."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from dataclasses import field as attribute
from typing import Any

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.files.reading import Reading
from fieldview.gui import work
from fieldview.gui.picture import MapOf
from fieldview.session.models import Session


@dataclass(frozen=True, eq=False)
class Found:
    """What a look at the files told.

    ``signature`` is the same for files that look the same; ``questions`` must be answered before the files
    can be opened; ``sentences`` are what was found and every doubt.
    """

    signature: str
    columns: tuple[Any, ...]
    titles: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    questions: tuple[str, ...]
    sentences: tuple[str, ...]
    field: Field | None = None
    map: MapOf | None = None
    levels: Mapping[str, tuple[float, float]] = attribute(default_factory=dict)
    speed: float | None = None


def look(session: Session, reading: Reading) -> Found:
    """A peek at the first file, and its first frame where nothing that must be known is missing."""
    from fieldview.files import expand, open_run, peek

    first = expand(session.run.files, session.folder)[0]
    told = peek(first, reading)
    columns = tuple(told.columns)
    questions = tuple(question.sentence for question in told.questions)
    shown = {}
    if not questions:
        try:
            shown = _drawn(open_run((first.name,), reading, folder=first.parent)[0])
        except InputError as error:
            questions = (*questions, str(error))
    return Found(
        signature="|".join(f"{c.name}[{c.unit or ''}]" for c in columns),
        columns=columns,
        titles=tuple(c.name for c in columns),
        rows=tuple(tuple(row) for row in told.first_rows),
        questions=questions,
        sentences=tuple(told.sentences),
        **shown,
    )


def _drawn(first: Field) -> dict:
    """The first frame with the map that shows a wrong sense soonest."""
    from fieldview.gui.canvas.arrows import typical_speed
    from fieldview.gui.pursuit import levels_of, reference_speed

    name = "vorticity" if first.in_plane and first.grid.is_plane else next(iter(first.components))
    drawn = work.quick_map(first, name)
    speed = reference_speed(typical_speed(first)) if first.in_plane else None
    levels = {name: levels_of(drawn)} if drawn is not None else {}
    return {"field": first, "map": drawn, "levels": levels, "speed": speed}
