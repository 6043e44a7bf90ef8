"""Repaints and frame steps over and over: no growth, no reference to None lost.

The long form, some minutes:  LOOPFLUX_SOAK=1 python -m pytest tests/gui/test_soak.py
"""

import os
import sys

import pytest

from tests.gui.conftest import FRAMES, settle

LONG = bool(os.environ.get("LOOPFLUX_SOAK"))
REPAINTS, STEPS = (2000, 500) if LONG else (300, 100)
WARM_UP = 20


def resident_bytes() -> int:
    """Memory of this process that is in use now; only Linux tells without further libraries."""
    with open("/proc/self/statm") as numbers:
        return int(numbers.read().split()[1]) * os.sysconf("SC_PAGE_SIZE")


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="reads /proc")
def test_repaints_neither_grow_nor_lose_references(window):
    for _ in range(WARM_UP):
        window.repaint()
        window.canvas.viewport().repaint()
    memory, nones = resident_bytes(), sys.getrefcount(None)
    for step in range(REPAINTS):
        window.canvas.zoom(1.02 if step % 2 else 1 / 1.02)
        window.repaint()
        window.canvas.viewport().repaint()
    assert resident_bytes() <= 1.05 * memory
    assert sys.getrefcount(None) > nones - REPAINTS // 2, "references to None are being lost"


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="reads /proc")
def test_frame_steps_do_not_grow(window, qtbot):
    def step(number):
        window.desk.go_to(number % FRAMES)
        qtbot.waitUntil(lambda: window.desk.picture.field_frame == number % FRAMES)

    for number in range(WARM_UP):
        step(number)
    settle(qtbot, window)
    memory = resident_bytes()
    for number in range(STEPS):
        step(number)
    settle(qtbot, window)
    assert resident_bytes() <= 1.05 * memory
