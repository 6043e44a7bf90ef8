"""Figures written as PDF, SVG or PNG: the same session gives the same bytes."""

from __future__ import annotations

import io
import os
from pathlib import Path
from typing import TYPE_CHECKING

import fieldview
from fieldview.compute.errors import InputError
from fieldview.files.writing import said_if_unwritable, write_whole
from fieldview.publish.figures.paper import style
from fieldview.session.figures import FigureSettings

if TYPE_CHECKING:
    from matplotlib.figure import Figure

ENDINGS = ("pdf", "svg", "png")


def picture(figure: Figure, settings: FigureSettings, ending: str) -> bytes:
    """The figure as the bytes of a file, which tell no time but SOURCE_DATE_EPOCH where that is set."""
    program = f"Loopflux {fieldview.__version__}"
    dated = "SOURCE_DATE_EPOCH" in os.environ
    about: dict = {
        "pdf": {"Creator": program, "Producer": program},
        "svg": {"Creator": program},
        "png": {"Software": program},
    }[ending]
    if not dated and ending != "png":
        about |= {"CreationDate": None} if ending == "pdf" else {"Date": None}
    stream = io.BytesIO()
    with style(settings):
        figure.savefig(stream, format=ending, dpi=settings.dpi, metadata=about)
    return stream.getvalue()


def save(figure: Figure, settings: FigureSettings, path: Path) -> None:
    """Write the figure whole; the ending of the name says the format."""
    ending = path.suffix[1:].lower()
    if ending not in ENDINGS:
        raise InputError(f"{path}: the ending must be .pdf, .svg or .png, of a moving picture .gif or .apng")
    with said_if_unwritable(path):
        write_whole(path, picture(figure, settings, ending))
