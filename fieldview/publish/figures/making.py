"""A figure of a session file, written: settings of the session with what the command changes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from pydantic import ValidationError

from fieldview.compute.errors import InputError
from fieldview.publish.figures import animation
from fieldview.publish.figures.captions import caption
from fieldview.publish.figures.drawing import draw, settings_named
from fieldview.publish.figures.saving import save
from fieldview.publish.measuring import Progress
from fieldview.session.figures import FigureSettings
from fieldview.session.replay import Workbench
from fieldview.session.store import load_session

CACHE_BYTES = 200_000_000


@dataclass(frozen=True)
class Made:
    """A figure that was written.

    Attributes
    ----------
    bench : Workbench
    settings : FigureSettings
    remarks : list of str
        Sources that have changed.
    """

    bench: Workbench
    settings: FigureSettings
    remarks: list[str]

    def caption(self) -> str:
        return caption(self.bench, self.settings)


def make(
    session: Path,
    out: Path,
    name: str | None,
    changed: dict,
    *,
    say: Callable[[str], None],
    progress: Progress,
    rate: float = 5.0,
) -> Made:
    """Draw and write the figure of this name; what is not None in ``changed`` replaces its settings.

    Raises InputError where the session, the settings or the place cannot be used; nothing is written then.
    """
    bench = Workbench(load_session(session), cache_bytes=CACHE_BYTES)
    settings = changed_settings(settings_named(bench, name), changed)
    remarks = bench.changed_sources()
    for sentence in remarks:
        say(sentence)
    if out.suffix[1:].lower() in animation.ENDINGS:
        animation.animate(bench, settings, out, rate=rate, progress=progress)
    else:
        save(draw(bench, settings), settings, out)
    return Made(bench, settings, remarks)


def changed_settings(settings: FigureSettings, changed: dict) -> FigureSettings:
    """The settings with these in their place, checked as in a session file."""
    taken = {key: value for key, value in changed.items() if value is not None}
    try:
        return FigureSettings.model_validate(settings.model_dump() | taken)
    except ValidationError as error:
        first = error.errors()[0]
        key = ".".join(str(part) for part in first["loc"]) or "the settings"
        raise InputError(f"figure, {key}: {first['msg'].removeprefix('Value error, ').lower()}") from None
