"""Regions as they stand in the session file."""

from __future__ import annotations

import math
from typing import Annotated, Literal

from pydantic import Field

from fieldview.compute import shapes
from fieldview.session.base import Entry, Point, quantity


class _Placed(Entry):
    """What every shape can say of itself."""

    def outline(self) -> shapes.Shape:
        """The shape in the plane, for computing."""
        raise NotImplementedError


class CircleShape(_Placed):
    shape: Literal["circle"] = "circle"
    centre: Point = quantity("point", help="Centre of the circle")
    radius: float = quantity("length", gt=0, help="Radius of the circle")

    def outline(self):
        return shapes.circle(self.centre, self.radius)


class EllipseShape(_Placed):
    shape: Literal["ellipse"] = "ellipse"
    centre: Point = quantity("point", help="Centre of the ellipse")
    semi_axes: Point = quantity("lengths", help="Half the length and half the width")
    angle_deg: float = quantity("angle", 0.0, help="First semi-axis, counter-clockwise from +x [deg]")

    def outline(self):
        return shapes.Ellipse(self.centre, self.semi_axes, math.radians(self.angle_deg))


class RectangleShape(_Placed):
    shape: Literal["rectangle"] = "rectangle"
    corners: tuple[Point, Point] = quantity("points", help="Two opposite corners; sides along the axes")

    def outline(self):
        return shapes.rectangle(self.corners)


class PolygonShape(_Placed):
    shape: Literal["polygon"] = "polygon"
    points: tuple[Point, ...] = quantity("points", min_length=3, help="Corners, in either order")

    def outline(self):
        return shapes.Polygon(self.points)


class LineShape(_Placed):
    shape: Literal["line"] = "line"
    points: tuple[Point, ...] = quantity("points", min_length=2, help="Points in the direction of travel")

    def outline(self):
        return shapes.Line(self.points)


class _Named(Entry):
    name: str = Field(min_length=1, description="Unique name of the region")
    colour: str | None = Field(None, description="Colour of the outline, #rrggbb; chosen in turn if left out")


class Circle(CircleShape, _Named):
    pass


class Ellipse(EllipseShape, _Named):
    pass


class Rectangle(RectangleShape, _Named):
    pass


class Polygon(PolygonShape, _Named):
    pass


class Line(LineShape, _Named):
    pass


Region = Annotated[Circle | Ellipse | Rectangle | Polygon | Line, Field(discriminator="shape")]
ClosedShape = Annotated[
    CircleShape | EllipseShape | RectangleShape | PolygonShape, Field(discriminator="shape")
]
