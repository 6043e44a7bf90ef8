"""Move: regions and their handles. Probe: a place held for the readout. Seed: streamlines."""

from __future__ import annotations

from PySide6.QtCore import Qt

from fieldview.gui import shaping
from fieldview.gui.canvas.layers import Sketch
from fieldview.gui.tools.base import Grip, Tool, handle_under, region_under


class Move(Tool):
    hint = "Click a region to choose it; drag its handles or its inside. Shift: straight, Ctrl: on nodes."
    shape_cursor = Qt.CursorShape.ArrowCursor

    def __init__(self, desk):
        super().__init__(desk)
        self._grip = Grip(desk)

    @property
    def busy(self) -> bool:
        return self._grip.holding

    def press(self, pointer):
        if self._grip.take_handle(pointer):
            return
        region = region_under(self.desk.picture.regions, pointer)
        self.desk.show(selected=region.name if region else None)
        if region is not None:
            self._grip.take_inside(region, pointer)

    def drag(self, pointer):
        self.desk.point_at(pointer.at)
        if self._grip.holding:
            self._grip.drag(pointer)

    def release(self, pointer):
        self._grip.release(pointer)

    def double(self, pointer):
        """On a corner: takes it out. On a region: nothing. Elsewhere the canvas fits the view."""
        chosen = self.desk.picture.selected
        handle = handle_under(chosen, pointer)
        if handle is not None and handle.kind == "corner":
            fewer = shaping.without_point(chosen, handle.index)
            if fewer is not None:
                self.desk.change_region(chosen.name, fewer, f"Remove a corner of {chosen.name}")
            return True
        return region_under(self.desk.picture.regions, pointer) is not None

    def cancel(self):
        self._grip.cancel()

    def cursor(self, pointer):
        if self._grip.holding:
            return Qt.CursorShape.ClosedHandCursor
        if pointer is None:
            return self.shape_cursor
        if handle_under(self.desk.picture.selected, pointer):
            return Qt.CursorShape.PointingHandCursor
        if region_under(self.desk.picture.regions, pointer):
            return Qt.CursorShape.SizeAllCursor
        return self.shape_cursor


class Probe(Tool):
    hint = "Click to hold the readout at a place; click outside the field to let it follow the pointer again."

    def __init__(self, desk):
        super().__init__(desk)
        self._held: complex | None = None

    @property
    def sketch(self):
        return Sketch((self._held,)) if self._held is not None else None

    def press(self, pointer):
        self._held = pointer.at if self.desk.is_over_field(pointer.at) else None
        self.desk.point_at(pointer.at)

    def hover(self, pointer):
        if self._held is None:
            self.desk.point_at(pointer.at)

    def left(self):
        if self._held is None:
            self.desk.point_at(None)

    @property
    def busy(self) -> bool:
        return self._held is not None

    def cancel(self):
        self._held = None


class Seed(Tool):
    """Plants seeds of streamlines; they belong to the view, not to the session's numbers."""

    hint = "Click to draw the streamline through a place; click a seed, or press Backspace, to take it away."

    def press(self, pointer):
        seeds = self.desk.picture.shown.seeds
        near = [seed for seed in seeds if abs(seed - pointer.at) <= pointer.reach]
        if near:
            self.desk.show(seeds=tuple(seed for seed in seeds if seed not in near))
        elif self.desk.is_over_field(pointer.at):
            self.desk.show(seeds=(*seeds, complex(pointer.at)))

    def drag(self, pointer):
        self.desk.point_at(pointer.at)

    def double(self, pointer):
        self.press(pointer)
        return True

    def key(self, key, modifiers):
        seeds = self.desk.picture.shown.seeds
        if key == Qt.Key.Key_Backspace and seeds:
            self.desk.show(seeds=seeds[:-1])
            return True
        return super().key(key, modifiers)
