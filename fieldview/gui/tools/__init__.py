"""The tools of the canvas: what the pointer does."""

from __future__ import annotations

from dataclasses import dataclass

from fieldview.gui.tools.base import Tool
from fieldview.gui.tools.drawing import CircleTool, Corners, EllipseTool, Freehand, LineTool, RectangleTool
from fieldview.gui.tools.editing import Keep, MaskTool, Reject
from fieldview.gui.tools.move import Move, Probe, Seed

__all__ = ["TOOLS", "Listed"]


@dataclass(frozen=True)
class Listed:
    """A tool as the bar and the menu list it; its icon is ``id``.svg."""

    id: str
    title: str
    key: str
    make: type[Tool]


TOOLS = (
    Listed("move", "Move", "V", Move),
    Listed("probe", "Probe", "P", Probe),
    Listed("polygon", "Polygon", "G", Corners),
    Listed("rectangle", "Rectangle", "R", RectangleTool),
    Listed("circle", "Circle", "C", CircleTool),
    Listed("ellipse", "Ellipse", "E", EllipseTool),
    Listed("line", "Line", "L", LineTool),
    Listed("freehand", "Freehand", "H", Freehand),
    Listed("reject", "Reject", "X", Reject),
    Listed("keep", "Keep", "K", Keep),
    Listed("mask", "Mask", "M", MaskTool),
    Listed("seed", "Seed", "S", Seed),
)
