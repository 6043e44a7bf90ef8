"""Tools that edit vectors: reject and keep by click or brush, and masks drawn as a polygon."""

from __future__ import annotations

import numpy as np

from fieldview.compute.field import Status
from fieldview.gui import ledger_edits
from fieldview.gui.canvas.layers import Sketch
from fieldview.gui.tools.base import Tool
from fieldview.gui.tools.drawing import Corners
from fieldview.session import regions, steps

BRUSH_PIXELS = 12.0


class Brush(Tool):
    """Vectors under the brush are taken while the button is held; letting go is one undo step."""

    wanted: tuple[Status, ...] = ()

    def __init__(self, desk):
        super().__init__(desk)
        self._at: complex | None = None
        self._taken: set[tuple[int, int]] | None = None

    @property
    def sketch(self):
        return Sketch((self._at,), brush_pixels=BRUSH_PIXELS) if self._at is not None else None

    @property
    def busy(self) -> bool:
        return self._taken is not None

    def press(self, pointer):
        self._taken = set()
        self._sweep(pointer)

    def hover(self, pointer):
        self._at = pointer.at
        self.desk.point_at(pointer.at)
        if self._taken is not None:
            self._sweep(pointer)

    def release(self, pointer):
        taken, self._taken = self._taken, None
        if taken:
            frame = self.desk.picture.field_frame
            self._commit(tuple((frame, iy, ix) for iy, ix in sorted(taken)))

    def double(self, pointer):
        self.press(pointer)
        return True

    def cancel(self):
        self._taken = None

    def left(self):
        self._at = None
        super().left()

    def _sweep(self, pointer):
        self._at = pointer.at
        field = self.desk.picture.field
        if field is None or self.desk.picture.shown.source != "frame":
            return
        under = np.abs(field.grid.nodes - pointer.at) <= BRUSH_PIXELS / pointer.scale
        under &= np.isin(field.status, self.wanted)
        self._taken |= {(int(iy), int(ix)) for iy, ix in zip(*np.nonzero(under), strict=True)}

    def _commit(self, vectors) -> None:
        raise NotImplementedError


class Reject(Brush):
    hint = "Click vectors, or sweep over them, to reject them by hand in this frame."
    wanted = (Status.MEASURED, Status.FILLED)

    def _commit(self, vectors):
        ledger_edits.by_hand(self.desk, reject=vectors)


class Keep(Brush):
    hint = "Click rejected vectors, or sweep over them, to take them back in this frame."
    wanted = (Status.REJECTED, Status.FILLED, Status.MISSING)

    def _commit(self, vectors):
        ledger_edits.by_hand(self.desk, keep=vectors)


class MaskTool(Corners):
    hint = "Click the corners of a body; Return closes. No vector inside takes part, in every frame."

    def _region(self, points):
        corners = tuple((z.real, z.imag) for z in points)
        return regions.Polygon(name="mask", points=corners)

    def _preview(self, points):
        """A mask has no numbers to follow."""

    def _put(self, region):
        shape = regions.PolygonShape(points=region.points)
        ledger_edits.put(self.desk, steps.Mask(region=shape))
