"""A run as a moving picture: frames with the look of the figure, as GIF or APNG."""

from __future__ import annotations

import io
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.files.writing import said_if_unwritable, write_whole
from fieldview.publish.figures.maps import drawn
from fieldview.publish.figures.panels import Panel, colour_scale, frame_words, panels_of
from fieldview.publish.figures.paper import style
from fieldview.publish.measuring import Progress
from fieldview.session.figures import FigureSettings
from fieldview.session.replay import Workbench

ENDINGS = ("gif", "apng")

_SCALED_BY = 12
"""Frames, spread over the run, that the colours are scaled by, so that they stay the same throughout."""


def animate(
    bench: Workbench,
    settings: FigureSettings,
    path: Path,
    *,
    rate: float = 5.0,
    progress: Progress = lambda frames, what, total: iter(frames),
) -> None:
    """Write the frames of a map one after the other.

    Parameters
    ----------
    bench : Workbench
    settings : FigureSettings
        Of a map; ``frames`` says which, ``dpi`` how large.
    path : Path
        Its ending, .gif or .apng, says the format.
    rate : float
        Frames shown in a second. [1/s]

    Raises
    ------
    InputError
        The settings or the path cannot be used.
    """
    ending = path.suffix[1:].lower()
    if ending not in ENDINGS:
        raise InputError(f"{path}: the ending of a moving picture must be .gif or .apng")
    if settings.kind != "map":
        raise InputError("a moving picture is made of maps; choose the kind map")
    if not 0.1 <= rate <= 100:
        raise InputError(f"--rate {rate:g}: give between 0.1 and 100 frames a second")
    frames = bench.frames(settings.frames)
    if len(frames) < 2:
        raise InputError(f'frames "{settings.frames}": a moving picture needs two frames or more')
    settings = _fixed_scale(bench, settings, frames)
    shown = progress(_pictures(bench, settings, frames), "drawing", len(frames))
    content = _written(shown, ending, rate)
    with said_if_unwritable(path):
        write_whole(path, content)


def _fixed_scale(bench: Workbench, settings: FigureSettings, frames: list) -> FigureSettings:
    """With the ends of the colours stated, found from frames spread over those shown."""
    step = -(-len(frames) // _SCALED_BY)
    panels = [
        Panel(frame, bench.field(frame), name) for name in settings.quantities for frame in frames[::step]
    ]
    scale = colour_scale(panels, settings)
    return settings.model_copy(update={"low": scale.low, "high": scale.high})


def _pictures(bench: Workbench, settings: FigureSettings, frames: list) -> Iterator:
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from PIL import Image

    size = None
    for frame in frames:
        one = settings.model_copy(update={"frames": str(frame)})
        panels = panels_of(bench, one)
        scale = replace(colour_scale(panels, one), beyond="both")
        one = one.model_copy(update={"title": one.title or frame_words(frame, panels[0].field)})
        with style(one):
            figure = drawn(bench, one, panels, scale)
            figure.set_dpi(one.dpi)
            canvas = FigureCanvasAgg(figure)
            canvas.draw()
            image = Image.fromarray(np.asarray(canvas.buffer_rgba())[..., :3].copy())
        # a legend that comes and goes changes the height; every frame is shown on the sheet of the first
        size = size or image.size
        if image.size != size:
            sheet = Image.new("RGB", size, "white")
            sheet.paste(image)
            image = sheet
        yield image


def _written(pictures: Iterator, ending: str, rate: float) -> bytes:
    # both formats look through all pictures before they write the first
    first, *others = pictures
    stream = io.BytesIO()
    options = {"save_all": True, "append_images": others, "duration": round(1000 / rate), "loop": 0}
    if ending == "gif":
        first.save(stream, "GIF", **options)
    else:
        first.save(stream, "PNG", **options)
    return stream.getvalue()
