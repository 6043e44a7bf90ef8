"""Panning the canvas with map and thinned arrows, against a bare map of the same size."""

import statistics
import time

import numpy as np
import pyqtgraph as pg
import pytest
from PySide6.QtCore import QPointF

from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.gui import theme
from fieldview.gui.app import application
from fieldview.gui.canvas.showing import Showing
from fieldview.gui.canvas.view import Canvas
from fieldview.gui.picture import MapOf, Picture

SIZE = (1000, 700)
REPEATS = 40


@pytest.fixture(scope="module")
def field() -> Field:
    axis = np.linspace(0.0, 1.0, 1000)
    x, y = np.meshgrid(axis, axis)
    return Field(Grid(axis, axis), u=np.sin(6 * y), v=np.cos(5 * x))


@pytest.fixture
def bare(field):
    application()
    view = pg.PlotWidget()
    view.resize(*SIZE)
    image = pg.ImageItem(np.asarray(field.u), axisOrder="row-major")
    image.setColorMap(pg.colormap.get("CET-D1"))
    image.setRect(0.0, 0.0, 1.0, 1.0)
    view.addItem(image)
    view.getViewBox().setAspectLocked(True)
    view.show()
    yield view
    view.close()


@pytest.fixture
def canvas(field):
    application()
    made = Canvas()
    made.resize(*SIZE)
    showing = Showing(made)
    showing.set_theme(theme.LIGHT)
    made.show()
    shown = MapOf("u", field, "u", "u", "m/s", "signed", np.asarray(field.u), None)
    picture = Picture(field=field, map=shown).showing(levels={"u": (-1.0, 1.0)}, speed=1.0)
    showing.draw(picture)
    yield made
    made.close()


def test_pan_with_map_and_arrows(bare, canvas):
    """At most twice a bare map: the arrows are drawn once on a sheet that panning shifts."""
    bare_box = bare.getViewBox()
    times = {"bare": [], "canvas": []}
    for step in range(REPEATS):
        sign = 1 if step % 20 < 10 else -1
        times["bare"].append(
            timed(bare, lambda sign=sign: bare_box.translateBy(x=3 * sign * bare_box.viewPixelSize()[0]))
        )
        times["canvas"].append(timed(canvas, lambda sign=sign: canvas.pan(QPointF(-3 * sign, 0))))
    medians = {name: statistics.median(found) for name, found in times.items()}
    ratio = medians["canvas"] / medians["bare"]
    print(f"pan: {medians['canvas'] * 1e3:.1f} ms against {medians['bare'] * 1e3:.1f} ms, ratio {ratio:.2f}")
    assert ratio <= 2.0


def timed(view, change) -> float:
    started = time.perf_counter()
    change()
    view.viewport().repaint()
    return time.perf_counter() - started
