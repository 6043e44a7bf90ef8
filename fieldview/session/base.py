"""What all session models share: strict keys, frozen values, and the unit of every number."""

from __future__ import annotations

from typing import Annotated

from pydantic import Field

from fieldview.files.reading import Entry

__all__ = ["Entry", "Finite", "Point", "quantity"]

Finite = Annotated[float, Field(allow_inf_nan=False)]
Point = tuple[Finite, Finite]


def quantity(kind: str, default=..., *, help: str, **limits):
    """A model field whose number has a physical dimension.

    ``kind`` says how it converts when the session's units change, and what unit a form shows:
    "point", "points" (positions), "length", "lengths" (x and y extents), "velocity", "velocities",
    "component limits", "rate" (per time), "frequency" (always per second), "nodes", "frames", "angle"
    or "ratio".
    """
    return Field(default, description=help, json_schema_extra={"quantity": kind}, **limits)
