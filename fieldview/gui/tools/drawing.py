"""Tools that draw a new region."""

from __future__ import annotations

from PySide6.QtCore import Qt

from fieldview.gui import shaping
from fieldview.gui.canvas.layers import Sketch
from fieldview.gui.tools.base import CLICK_PIXELS, Grip, Tool, handle_under
from fieldview.session import regions


class Drawing(Tool):
    """Common to all of them: the chosen region's handles can be dragged while nothing is being drawn."""

    shape = "polygon"

    def __init__(self, desk):
        super().__init__(desk)
        self._grip = Grip(desk)
        self._points: list[complex] = []
        self._tip: complex | None = None

    @property
    def busy(self) -> bool:
        return bool(self._points) or self._grip.holding

    @property
    def sketch(self):
        points = [*self._points, *([self._tip] if self._tip is not None and self._points else [])]
        return Sketch(tuple(points), closed=self.shape != "line") if self._points else None

    def press(self, pointer):
        # centres are left alone: a contour around the same centre begins there
        if not self._points and self._grip.take_handle(pointer, kinds=("corner", "rim", "side", "insert")):
            return
        self._pressed(pointer)

    def drag(self, pointer):
        self.desk.point_at(pointer.at)
        if self._grip.holding:
            self._grip.drag(pointer)
        else:
            self._moved(pointer)

    def hover(self, pointer):
        self.desk.point_at(pointer.at)
        if self._points:
            self._moved(pointer)

    def release(self, pointer):
        if self._grip.holding:
            if not self._grip.release(pointer):
                self._pressed(pointer)  # a mere click on a handle begins a drawing there
                self._released(pointer)
        else:
            self._released(pointer)

    def cancel(self):
        if self._grip.holding:
            self._grip.cancel()
        self._points, self._tip = [], None
        self.desk.drop_draft()

    def cursor(self, pointer):
        if not self._points and pointer and handle_under(self.desk.picture.selected, pointer):
            return Qt.CursorShape.PointingHandCursor
        return self.shape_cursor

    def _pressed(self, pointer): ...

    def _moved(self, pointer): ...

    def _released(self, pointer): ...

    def _finish(self, region) -> None:
        """Put the drawing into the session, or say what is wrong with it and go on drawing."""
        problem = region.outline().problem()
        if problem is not None:
            self.desk.complain(f"{problem[:1].upper()}{problem[1:]}.")
            return
        self._points, self._tip = [], None
        self._put(region)

    def _put(self, region) -> None:
        self.desk.add_region(region)


class Corners(Drawing):
    """Corner by corner: click, click, … Return or a double click closes, Backspace takes one back."""

    hint = "Click corners; Return closes, Backspace takes one back. Shift: straight, Ctrl: on nodes."
    least = 3

    def _pressed(self, pointer):
        if len(self._points) >= self.least and self._closes(pointer):
            self._close()
            return
        self._points.append(self._place(pointer))
        self._tip = None
        self._preview(self._points)

    def _moved(self, pointer):
        self._tip = self._place(pointer)
        self._preview([*self._points, self._tip])

    def double(self, pointer):
        if not self._points:
            return False
        self._close()
        return True

    def key(self, key, modifiers):
        if self._points and key in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self._close()
            return True
        if self._points and key == Qt.Key.Key_Backspace:
            self._points.pop()
            self._tip = None
            if self._points:
                self._preview(self._points)
            else:
                self.cancel()
            return True
        return super().key(key, modifiers)

    def _closes(self, pointer) -> bool:
        return abs(pointer.at - self._points[0]) <= pointer.reach

    def _place(self, pointer) -> complex:
        if pointer.shift and self._points:
            return shaping.straightened(pointer.at, self._points[-1])
        return pointer.at

    def _region(self, points):
        corners = tuple((z.real, z.imag) for z in points)
        return regions.Polygon(name=self.desk.free_name("polygon"), points=corners)

    def _preview(self, points):
        if len(points) >= self.least:
            self.desk.draft(self._region(points))

    def _close(self):
        if len(self._points) < self.least:
            self.desk.complain(
                f"A {self.shape} needs at least {self.least} points; click more, or press Esc to drop it."
            )
            return
        self._finish(self._region(self._points))


class LineTool(Corners):
    hint = "Click points in the direction of travel; Return ends the line. Shift: straight, Ctrl: on nodes."
    shape = "line"
    least = 2

    def _closes(self, pointer) -> bool:
        return False

    def _region(self, points):
        return regions.Line(name=self.desk.free_name("line"), points=tuple((z.real, z.imag) for z in points))


class Stretched(Drawing):
    """From one place to another: drag, or click twice."""

    def _pressed(self, pointer):
        if self._points:
            self._moved(pointer)
            self._complete()
        else:
            self._points = [pointer.at]

    def _moved(self, pointer):
        if not self._points:
            return
        self._tip = pointer.at
        region = self._region(self._points[0], pointer.at, pointer.shift)
        self._last = region
        if region is not None:
            self.desk.draft(region)

    def _released(self, pointer):
        if not self._points:
            return
        if abs(pointer.at - self._points[0]) * pointer.scale >= CLICK_PIXELS:
            self._moved(pointer)
            self._complete()

    def double(self, pointer):
        """The second of two quick clicks is no double click while a drawing is under way."""
        if not self._points:
            return False
        self._pressed(pointer)
        return True

    def key(self, key, modifiers):
        if self._points and key in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self._complete()
            return True
        if self._points and key == Qt.Key.Key_Backspace:
            self.cancel()
            return True
        return super().key(key, modifiers)

    @property
    def sketch(self):
        return None if self._tip is not None or not self._points else Sketch(tuple(self._points))

    def _complete(self):
        region = getattr(self, "_last", None)
        self._last = None
        if region is None:
            self.desk.complain("The two places are in line; drag so that an area is enclosed.")
            return
        self._finish(region)

    def _region(self, start: complex, end: complex, straight: bool):
        raise NotImplementedError


class RectangleTool(Stretched):
    hint = "Drag from corner to corner; Shift keeps it square."
    shape = "rectangle"

    def _region(self, start, end, straight):
        end = shaping.squared(end, start) if straight else end
        if start.real == end.real or start.imag == end.imag:
            return None
        low = (min(start.real, end.real), min(start.imag, end.imag))
        high = (max(start.real, end.real), max(start.imag, end.imag))
        return regions.Rectangle(name=self.desk.free_name("rectangle"), corners=(low, high))


class CircleTool(Stretched):
    hint = "Drag from the centre outward."
    shape = "circle"

    def _region(self, start, end, straight):
        if start == end:
            return None
        return regions.Circle(
            name=self.desk.free_name("circle"), centre=(start.real, start.imag), radius=abs(end - start)
        )


class EllipseTool(Stretched):
    hint = "Drag from the centre to a corner of the box around it; Shift keeps it round."
    shape = "ellipse"

    def _region(self, start, end, straight):
        arm = shaping.squared(end, start) - start if straight else end - start
        if arm.real == 0 or arm.imag == 0:
            return None
        return regions.Ellipse(
            name=self.desk.free_name("ellipse"),
            centre=(start.real, start.imag),
            semi_axes=(abs(arm.real), abs(arm.imag)),
        )


class Freehand(Drawing):
    hint = "Draw the contour in one stroke; it closes when you let go."
    shape = "freehand"

    def _pressed(self, pointer):
        self._points = [pointer.at]
        self._step = 1.0 / pointer.scale

    def _moved(self, pointer):
        if self._points and abs(pointer.at - self._points[-1]) >= 2 * self._step:
            self._points.append(pointer.at)

    def hover(self, pointer):
        self.desk.point_at(pointer.at)

    @property
    def sketch(self):
        return Sketch(tuple(self._points), closed=True, vertices=False) if self._points else None

    def _released(self, pointer):
        if not self._points:
            return
        outline = simplified(self._points, 1.2 * self._step)
        self._points = []
        if outline is None:
            self.desk.complain("The stroke encloses no area, or crosses itself; draw one loop.")
            return
        points = tuple((z.real, z.imag) for z in outline)
        self._finish(regions.Polygon(name=self.desk.free_name("freehand"), points=points))


def simplified(points: list[complex], tolerance: float) -> list[complex] | None:
    """The stroke with only the corners it needs; None where it is no simple loop."""
    import shapely

    if len(points) < 4:
        return None
    ring = shapely.Polygon([(z.real, z.imag) for z in points]).simplify(tolerance)
    if not isinstance(ring, shapely.Polygon) or ring.is_empty or not ring.is_valid:
        return None
    return [complex(x, y) for x, y in ring.exterior.coords[:-1]]
