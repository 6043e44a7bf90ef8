"""Puts a picture on the canvas: only what changed since the last one is made anew."""

from __future__ import annotations

import numpy as np

from fieldview.compute.field import Status
from fieldview.gui import theme as themes
from fieldview.gui.canvas.arrows import Tint, arrow_scale, thinning
from fieldview.gui.canvas.furniture import Bar, Key
from fieldview.gui.canvas.layers import Flow
from fieldview.gui.canvas.map_image import map_image
from fieldview.gui.canvas.region_layer import Marked
from fieldview.gui.canvas.view import Canvas, level_indices
from fieldview.gui.picture import MapOf, Picture
from fieldview.gui.region_text import label_lines
from fieldview.gui.shaping import handles
from fieldview.gui.theme import LIGHT, Theme
from fieldview.publish import wording
from fieldview.publish.units_shown import UnitView

_MARK_WORDS = (
    (Status.MEASURED, "measured"),
    (Status.FILLED, "filled"),
    (Status.REJECTED, "rejected"),
    (Status.MASKED, "masked"),
    (Status.MISSING, "missing"),
)


class Showing:
    """Draws pictures on one canvas."""

    def __init__(self, canvas: Canvas):
        self._canvas = canvas
        self._seen: dict[str, tuple] = {}
        self._picture = Picture()
        self._theme: Theme = LIGHT
        self._marks: tuple[tuple[str, str], ...] = ()
        canvas.range_moved.connect(self._lens_changed)

    def set_theme(self, theme: Theme) -> None:
        self._theme = theme
        self._seen.clear()
        self._canvas.set_theme(theme)
        self.draw(self._picture)

    def draw(self, picture: Picture) -> None:
        self._picture = picture
        canvas, shown = self._canvas, picture.shown
        if self._new("units", picture.unit_view):
            for part in ("map", "flow", "regions"):
                self._seen.pop(part, None)
            self._label_axes(picture)
        if self._new("field", picture.field):
            canvas.set_extent(picture.field)
            self._marks = marks_of(picture.field)
            self._label_axes(picture)
        levels = shown.levels.get(picture.map.name) if picture.map else None
        if self._new("map", picture.map, levels, picture.field):
            self._draw_map(picture.map, levels)
        if self._new("streams", shown.seeds, picture.streams_now):
            lines = picture.streams_now.lines if picture.streams_now else ()
            canvas.stream_layer.show(shown.seeds, lines, self._theme)
        if self._new("iso", picture.iso_now):
            lines = picture.iso_now.lines if picture.iso_now else ()
            canvas.lines_layer.show(lines, self._theme)
        if self._new(
            "flow",
            picture.field,
            picture.tint_now,
            shown.speed,
            shown.arrow_stretch,
            shown.rejected_arrows,
            shown.levels.get(shown.arrow_colour),
        ):
            self._draw_flow()
        regions = picture.regions + (
            (picture.draft,) if picture.draft is not None and picture.draft_of is None else ()
        )
        measured = tuple(picture.measured_of(region) for region in regions)
        if self._new("regions", regions, measured, shown.selected, shown.coverage, picture.stale):
            canvas.corners = _corners_of(regions, shown.selected)
            canvas.region_layer.show(
                tuple(
                    self._marked(place, region, found)
                    for place, (region, found) in enumerate(zip(regions, measured, strict=True))
                ),
                self._theme,
            )

    def _new(self, part: str, *wanted) -> bool:
        before = self._seen.get(part)
        if before is not None and all(a is b or _same(a, b) for a, b in zip(wanted, before, strict=True)):
            return False
        self._seen[part] = wanted
        return True

    def _draw_map(self, shown: MapOf | None, levels) -> None:
        canvas, field = self._canvas, self._picture.field
        if shown is None or levels is None or shown.of is not field:
            canvas.map_layer.show(None, field, self._theme)
            canvas.colour_bar.show_bar(None, self._theme)
            return
        colours = themes.table_for_range(self._theme, shown.kind, *levels)
        canvas.map_layer.show(map_image(shown.values, field.grid, colours, *levels), field, self._theme)
        factor, _ = self._picture.unit_view.of(shown.unit)
        label = self._picture.unit_view.label(f"{shown.title} {shown.symbol}", shown.unit)
        beyond = (
            bool(np.nanmin(shown.values, initial=np.inf) < levels[0]),
            bool(np.nanmax(shown.values, initial=-np.inf) > levels[1]),
        )
        signed = shown.kind == "signed"
        canvas.colour_bar.show_bar(
            Bar(colours, factor * levels[0], factor * levels[1], label, *beyond, signed), self._theme
        )

    def _lens_changed(self) -> None:
        # the thinning and the arrows' length on the screen follow the zoom
        lens = self._canvas.lens()
        if self._new("lens", round(lens.scale, 9), lens.width, lens.height):
            self._draw_flow()

    def _draw_flow(self) -> None:
        canvas, picture, shown = self._canvas, self._picture, self._picture.shown
        field = picture.field
        if field is None:
            canvas.flow_layer.show(None)
            canvas.legend.show_key(None, self._theme)
            return
        lens = canvas.lens()
        scale = arrow_scale(field, lens, shown.speed or 0.0, shown.arrow_stretch)
        tint, said = self._tint(picture)
        canvas.flow_layer.show(Flow(field, self._theme, scale, tint, shown.rejected_arrows))
        factor, unit = picture.unit_view.of(field.units.velocity)
        speed = f"{wording.short(factor * shown.speed)} {unit or 'U'}" if shown.speed else ""
        thin = said + thinning(field, lens).sentence if field.in_plane else "no arrows: the field has only w"
        pixels = scale.pixels if field.in_plane and shown.speed else 0.0
        canvas.legend.show_key(Key(speed if pixels else "", pixels, thin, self._marks), self._theme)

    def _tint(self, picture: Picture) -> tuple[Tint | None, str]:
        """Colours of the arrows by a quantity, and what the legend says of them."""
        tint = picture.tint_now
        if tint is None or tint.name not in picture.shown.levels:
            return None, ""
        low, high = picture.shown.levels[tint.name]
        factor, unit = picture.unit_view.of(tint.unit)
        ends = " … ".join(wording.short(factor * end, signed=tint.kind == "signed") for end in (low, high))
        table = themes.table_for_range(self._theme, tint.kind, low, high)
        return Tint(level_indices(tint.values, low, high), table), f"colour: {tint.symbol} {ends} {unit} · "

    def _label_axes(self, picture: Picture) -> None:
        if picture.field is not None:
            factor, length = picture.unit_view.of(picture.field.units.length)
            x, y = (f"{name} [{length}]" if length else f"{name} / L" for name in "xy")
            self._canvas.set_axis_labels(x, y, factor)

    def _marked(self, place: int, region, measured) -> Marked:
        shown = self._picture.shown
        live = region is self._picture.draft
        chosen = live or region.name == shown.selected
        lines = (
            label_lines(measured.row, coverage=shown.coverage, full=chosen, view=self._picture.unit_view)
            if measured
            else ()
        )
        stale = self._picture.stale
        return Marked(
            region,
            place,
            tuple(text for text, _ in lines),
            chosen,
            tuple(noise or stale for _, noise in lines),
        )


def _corners_of(regions, selected: str | None) -> np.ndarray:
    """Corners and centres of the regions, but not of the one in hand: it must not stick to itself."""
    found = [
        handle.at
        for region in regions
        if region.name != selected
        for handle in handles(region)
        if handle.kind in ("corner", "centre")
    ]
    return np.array(found, complex)


def marks_of(field) -> tuple[tuple[str, str], ...]:
    """The node marks that occur in a field, in the legend's order."""
    if field is None:
        return ()
    found = [(word, word) for status, word in _MARK_WORDS if field.count(status)]
    return tuple(found) if field.in_plane else tuple(f for f in found if f[0] != "measured")


def _same(a, b) -> bool:
    if isinstance(a, tuple) and isinstance(b, tuple):
        return len(a) == len(b) and all(x is y or _same(x, y) for x, y in zip(a, b, strict=True))
    return isinstance(a, int | float | complex | str | bool | UnitView) and type(a) is type(b) and a == b
