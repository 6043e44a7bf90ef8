"""Places pointed out on the canvas for a sheet: a known distance, the origin."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import Qt

from fieldview.gui.canvas.layers import Sketch
from fieldview.gui.tools.base import Tool


class Pick(Tool):
    """Waits for so many clicks, hands the places over and is done; Esc gives up."""

    def __init__(self, desk, count: int, hint: str, done: Callable[[tuple[complex, ...] | None], None]):
        super().__init__(desk)
        self.hint = hint
        self._count, self._done = count, done
        self._points: list[complex] = []
        self._tip: complex | None = None

    @property
    def sketch(self):
        tip = [self._tip] if self._tip is not None and self._points else []
        return Sketch((*self._points, *tip)) if self._points else None

    @property
    def busy(self) -> bool:
        return True

    def press(self, pointer):
        self._points.append(pointer.at)
        if len(self._points) == self._count:
            self._done(tuple(self._points))

    def hover(self, pointer):
        self._tip = pointer.at
        self.desk.point_at(pointer.at)

    def double(self, pointer):
        self.press(pointer)
        return True

    def key(self, key, modifiers):
        if key == Qt.Key.Key_Backspace and self._points:
            self._points.pop()
            return True
        return super().key(key, modifiers)

    def cancel(self):
        self._done(None)
