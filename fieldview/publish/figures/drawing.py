"""The figure of a session: which kind is drawn by whom."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.publish.figures import curves, maps
from fieldview.publish.figures.paper import style
from fieldview.session.figures import FigureSettings
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


def first_quantity(field: Field) -> str:
    """What a field is shown by where nothing is said: its vorticity, else its first component."""
    plane = field.in_plane and field.grid.is_plane
    return "vorticity" if plane else next(iter(field.components))


def settings_named(bench: Workbench, name: str | None) -> FigureSettings:
    """The settings of a figure of the session; without a name the first one, else those that fit the run."""
    session = bench.session
    if name is None and session.figures:
        return session.figures[0]
    if name is None:
        return FigureSettings(quantities=(first_quantity(bench.field(0)),))
    found = next((figure for figure in session.figures if figure.name == name), None)
    if found is None:
        known = ", ".join(figure.name for figure in session.figures) or "none"
        raise InputError(f'there is no figure "{name}" in the session; the figures are: {known}')
    return found
