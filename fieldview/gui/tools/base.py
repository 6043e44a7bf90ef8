"""What every tool can do, and taking hold of a region's handles, which most of them share."""

from __future__ import annotations

from PySide6.QtCore import Qt

from fieldview.gui import shaping
from fieldview.gui.canvas.layers import Sketch
from fieldview.gui.canvas.view import Pointer

CLICK_PIXELS = 3.0
"""A press that moves less than this is a click."""


HANDLE_KINDS = ("corner", "rim", "side", "centre", "insert")
"""In the order in which they are taken where they lie close together."""


class Tool:
    """A tool in use. Pointer events come in plane coordinates; what it draws meanwhile is its ``sketch``."""

    hint = ""
    shape_cursor = Qt.CursorShape.CrossCursor

    def __init__(self, desk):
        self.desk = desk

    @property
    def sketch(self) -> Sketch | None:
        return None

    @property
    def busy(self) -> bool:
        """Whether a drawing or drag is under way, which Esc would drop."""
        return False

    def press(self, pointer: Pointer) -> None: ...

    def drag(self, pointer: Pointer) -> None:
        self.hover(pointer)

    def release(self, pointer: Pointer) -> None: ...

    def hover(self, pointer: Pointer) -> None:
        self.desk.point_at(pointer.at)

    def double(self, pointer: Pointer) -> bool:
        """A double click; False leaves it to the canvas, which fits the view."""
        return False

    def key(self, key: int, modifiers) -> bool:
        """A key press; True where the tool took it."""
        if key == Qt.Key.Key_Escape and self.busy:
            self.cancel()
            return True
        return False

    def cancel(self) -> None:
        """Drop what is under way."""

    def left(self) -> None:
        self.desk.point_at(None)

    def cursor(self, pointer: Pointer | None) -> Qt.CursorShape:
        return self.shape_cursor


class Grip:
    """A handle, or the inside, of a region in the pointer's hand. One whole drag is one undo step."""

    def __init__(self, desk):
        self._desk = desk
        self._region = None
        self._handle: shaping.Handle | None = None
        self._from = 0j
        self._moved = False

    @property
    def holding(self) -> bool:
        return self._region is not None

    def take_handle(self, pointer: Pointer, *, kinds: tuple[str, ...] = HANDLE_KINDS) -> bool:
        """Take the selected region's handle under the pointer, if there is one of these kinds."""
        handle = handle_under(self._desk.picture.selected, pointer)
        if handle is None or handle.kind not in kinds:
            return False
        self._start(self._desk.picture.selected, handle, pointer)
        return True

    def take_inside(self, region, pointer: Pointer) -> None:
        self._start(region, None, pointer)

    def _start(self, region, handle, pointer):
        self._region, self._handle = region, handle
        self._from, self._moved = pointer.at, False

    def drag(self, pointer: Pointer) -> None:
        if not self._moved and abs(pointer.at - self._from) * pointer.scale < CLICK_PIXELS:
            return
        self._moved = True
        self._desk.draft(self._changed(pointer), of=self._region.name)

    def release(self, pointer: Pointer) -> bool:
        """Let go; True where something was moved."""
        region, moved = self._region, self._moved
        if region is not None and moved:
            verb = "Move" if self._handle is None else "Reshape"
            self._desk.change_region(region.name, self._changed(pointer), f"{verb} {region.name}")
        self._region = None
        return moved

    def cancel(self) -> None:
        self._region = None
        self._desk.drop_draft()

    def _changed(self, pointer: Pointer):
        if self._handle is not None:
            return shaping.dragged(self._region, self._handle, pointer.at, straight=pointer.shift)
        by = pointer.at - self._from
        if pointer.shift:
            by = by.real + 0j if abs(by.real) >= abs(by.imag) else 1j * by.imag
        return shaping.moved(self._region, by)


def handle_under(region, pointer: Pointer) -> shaping.Handle | None:
    """The handle of a region that the pointer touches; corners go before the places to insert one."""
    if region is None:
        return None
    near = [h for h in shaping.handles(region) if abs(h.at - pointer.at) <= pointer.reach]
    return min(near, key=lambda h: (HANDLE_KINDS.index(h.kind), abs(h.at - pointer.at)), default=None)


def region_under(regions, pointer: Pointer):
    """The topmost region on whose outline, or in whose inside, the pointer is."""
    for region in reversed(regions):
        if _distance(shaping.outline_points(region), region.shape != "line", pointer.at) <= pointer.reach:
            return region
    inside = [
        r for r in regions if r.shape != "line" and r.outline().contains(complex(pointer.at)) and _area(r)
    ]
    return min(inside, key=_area, default=None)


def _area(region) -> float:
    return region.outline().area


def _distance(points, closed: bool, at: complex) -> float:
    import numpy as np

    ends = np.roll(points, -1) if closed else points[1:]
    starts = points if closed else points[:-1]
    arms = ends - starts
    length2 = np.maximum(np.abs(arms) ** 2, 1e-300)
    share = np.clip(((at - starts) * arms.conj()).real / length2, 0, 1)
    return float(np.abs(starts + share * arms - at).min())
