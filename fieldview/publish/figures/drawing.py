"""The figure of a session: which kind is drawn by whom."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from fieldview.compute.errors import InputError
from fieldview.publish.figures import curves, maps
from fieldview.publish.figures.paper import style
from fieldview.session.figures import FigureSettings
from fieldview.session.models import Session
from fieldview.session.replay import Workbench

if TYPE_CHECKING:
    from matplotlib.figure import Figure

_KINDS: dict[str, Callable] = {
    "map": maps.field_maps,
    "growth": curves.growth,
    "around": curves.around_contour,
    "profile": curves.profile,
    "time": curves.over_time,
    "spectrum": curves.spectrum,
    "convergence": curves.convergence,
}


def draw(bench: Workbench, settings: FigureSettings) -> Figure:
    """The figure, as matplotlib holds it.

    Raises InputError where the settings name what the session does not have.
    """
    with style(settings):
        return _KINDS[settings.kind](bench, settings)


def settings_named(session: Session, name: str | None) -> FigureSettings:
    """The settings of a figure of the session; without a name the first one, else the defaults."""
    if name is None:
        return session.figures[0] if session.figures else FigureSettings()
    found = next((figure for figure in session.figures if figure.name == name), None)
    if found is None:
        known = ", ".join(figure.name for figure in session.figures) or "none"
        raise InputError(f'there is no figure "{name}" in the session; the figures are: {known}')
    return found
