"""Which background work a picture still needs, and where its answers go."""

from __future__ import annotations

import numpy as np
from PySide6.QtCore import QTimer

from fieldview.gui import work
from fieldview.gui.canvas.arrows import typical_speed
from fieldview.gui.jobs import LATER, Answer
from fieldview.gui.picture import MapOf, Measured, Picture, field_parts
from fieldview.publish import wording

REST_MS = 30


class Pursuit:
    """Compares what the picture shows with what it should show, and asks for the difference.

    Every piece has a key made of all it depends on; work is asked for when the key changes.
    """

    def __init__(self, desk):
        self._desk = desk
        self._keys: dict[str, object] = {}
        self._share_parts: tuple | None = None
        self._run_key: tuple | None = None
        # what can wait gives way to the painting of what cannot
        self._rest = QTimer(desk)
        self._rest.setSingleShot(True)
        self._rest.setInterval(REST_MS)
        self._rest.timeout.connect(self._pursue_rest)
        self._whole_run: tuple = (None, None)

    def forget(self) -> None:
        self._keys.clear()
        self._whole_run = (None, None)

    def pursue(self) -> None:
        """Ask for what the canvas needs at once, and soon for the rest."""
        picture = self._desk.picture
        if picture.run is None or self._desk.bench is None:
            return
        self._field(picture)
        if picture.field is not None:
            self._map(picture)
            self._rest.start()

    @property
    def idle(self) -> bool:
        return not self._rest.isActive()

    def _pursue_rest(self) -> None:
        picture = self._desk.picture
        if picture.run is None or self._desk.bench is None or picture.field is None:
            return
        self._numbers(picture)
        self._iso(picture)
        self._streams(picture)
        self._curve(picture)
        self._cards(picture)

    def _changed(self, kind: str, key: object) -> bool:
        if self._keys.get(kind) == key:
            return False
        self._keys[kind] = key
        return True

    # -- what is needed ------------------------------------------------------------------------------

    def _field(self, picture: Picture) -> None:
        shown, session = picture.shown, picture.session
        of_frame = None if shown.source == "mean" else shown.frame
        key = (field_parts(session), of_frame, shown.source, shown.as_of)
        if self._changed("field", key):
            self._run_key = (field_parts(session), shown.as_of)
            known = self._whole_run[1] if self._whole_run[0] == self._run_key else None
            over_run = shown.source != "frame" and known is None
            self._desk.jobs.submit(
                "field",
                work.evaluate,
                session,
                self._desk.bench,
                shown.frame,
                shown.source,
                shown.as_of,
                shown.quantity,
                known,
                title="Going through the run" if over_run else f"Evaluating frame {shown.frame + 1}",
                reports=True,
            )

    def _numbers(self, picture: Picture) -> None:
        session, field = picture.session, picture.field
        wanted = _unmeasured(session, picture.measured)
        key = (field, wanted, session.line)
        if not self._changed("numbers", key):
            return
        if not wanted:
            self._desk.jobs.cancel("numbers")
            return
        self._desk.jobs.submit(
            "numbers", work.measure_fully, session, field, wanted, lane="derive", title="Measuring regions"
        )

    def _map(self, picture: Picture) -> None:
        shown, field = picture.shown, picture.field
        for kind, name in (("map", shown.quantity), ("tint", shown.arrow_colour)):
            present = getattr(picture, kind)
            there = present is not None and present.of is field and present.name == name
            if not self._changed(kind, (field, name)) or name is None or there:
                continue
            self._desk.jobs.submit(kind, work.quick_map, field, name, lane="derive", title="Drawing the map")

    def _iso(self, picture: Picture) -> None:
        name = picture.shown.iso_lines
        levels = picture.shown.levels.get(name)
        if not self._changed("iso", (picture.field, name, levels)):
            return
        if name is None:
            self._desk.jobs.cancel("iso")
            return
        self._desk.jobs.submit("iso", _iso_of, picture.field, name, levels, lane="derive", title="Iso-lines")

    def _streams(self, picture: Picture) -> None:
        seeds = picture.shown.seeds
        if not self._changed("streams", (picture.field, seeds)):
            return
        if not seeds:
            self._desk.jobs.cancel("streams")
            return
        given = (picture.field, seeds)
        self._desk.jobs.submit("streams", work.streams, *given, lane="derive", title="Streamlines")

    def _curve(self, picture: Picture) -> None:
        page, region = picture.shown.drawer, picture.selected
        closed = region is not None and region.shape != "line"
        fits = {"around": closed, "growth": closed, "profile": region is not None and not closed}
        session = picture.session
        if not self._changed("curve", (picture.field, page, region, session.line)):
            return
        if not fits.get(page, False):
            self._desk.jobs.cancel("curve")
            return
        given = (session, picture.field, page, region)
        self._desk.jobs.submit("curve", work.curve_of, *given, lane="derive", title="Drawing the curve")

    def _cards(self, picture: Picture) -> None:
        field, shown = picture.field, picture.shown
        if not self._changed("cards", (field, shown.quantity)):
            return
        names = work.available(field)
        first = [shown.quantity] if shown.quantity in names else []
        order = (*first, *(n for n in names if n not in first))
        self._desk.jobs.submit(
            "cards", work.deal_cards, field, order, lane="cards", urgency=LATER, title="Quantities"
        )

    # -- what came -----------------------------------------------------------------------------------

    def answered(self, answer: Answer) -> None:
        getattr(self, f"_got_{answer.kind}")(answer.value)

    def _got_field(self, got: work.Evaluated) -> None:
        self._desk.bench = got.bench
        if got.whole_run is not None:
            self._whole_run = (self._run_key, got.whole_run)
        picture = self._desk.picture
        parts = field_parts(picture.session)
        shares = picture.shares if parts == self._share_parts else {}
        self._share_parts = parts
        if picture.shown.source == "frame" and picture.shown.as_of is None:
            shares = {**shares, got.frame: work.measured_share(got.field)}
        shown = picture.shown
        changes = {} if got.frame == shown.frame or got.facts is None else {"frame": got.frame}
        if shown.speed is None and got.field.in_plane:
            changes["speed"] = reference_speed(typical_speed(got.field))
        names = work.available(got.field)
        if shown.quantity not in names and names:
            changes["quantity"] = "w" if "w" in names else names[0]
        if got.map is not None and got.map.name not in shown.levels:
            changes["levels"] = {**shown.levels, got.map.name: levels_of(got.map)}
        measured = {r.name: got.measured[r.name] for r in picture.session.regions if r.name in got.measured}
        self._desk.update(
            field=got.field,
            field_frame=got.frame,
            tallies=got.tallies,
            prepared=got.prepared,
            map=got.map,
            measured=measured,
            run=got.facts or picture.run,
            shares=shares,
            shown=picture.showing(**changes).shown,
        )

    def _got_numbers(self, got: Measured) -> None:
        measured = {**self._desk.picture.measured, got.region.name: got}
        # the request was for these very regions; mark them as served before the picture asks again
        wanted = _unmeasured(self._desk.picture.session, measured)
        self._keys["numbers"] = (self._desk.picture.field, wanted, self._desk.picture.session.line)
        self._desk.update(measured=measured)

    def _got_map(self, got: MapOf) -> None:
        self._desk.update(map=got, shown=self._with_levels(got))

    def _got_tint(self, got: MapOf) -> None:
        self._desk.update(tint=got, shown=self._with_levels(got))

    def _got_iso(self, got) -> None:
        self._desk.update(iso=got)

    def _got_streams(self, got) -> None:
        self._desk.update(streams=got)

    def _got_curve(self, got) -> None:
        self._desk.update(curve=got)

    def _got_cards(self, got) -> None:
        if isinstance(got, MapOf):
            if self._desk.picture.map is not None and got.name == self._desk.picture.map.name:
                self._desk.update(map=got)
        elif got:
            self._desk.update(cards={**self._desk.picture.cards, **{card.name: card for card in got}})

    def _got_follow(self, got) -> None:
        frame, share, traced = got
        traces = {**self._desk.picture.traces, frame: traced}
        self._desk.update(traces=traces, shares={**self._desk.picture.shares, frame: share})

    def _with_levels(self, got: MapOf):
        shown = self._desk.picture.shown
        if got.name in shown.levels:
            return shown
        return self._desk.picture.showing(levels={**shown.levels, got.name: levels_of(got)}).shown


def levels_of(shown: MapOf) -> tuple[float, float]:
    """A round colour-bar range for a map, see `levels_of_values`."""
    return levels_of_values(shown.values, shown.kind)


def levels_of_values(values: np.ndarray, kind: str) -> tuple[float, float]:
    """A round colour-bar range that few values exceed; symmetric where the quantity has a sign."""
    values = values[np.isfinite(values)]
    if values.size == 0:
        return (0.0, 1.0)
    if kind == "cyclic":
        return (-np.pi, np.pi)
    if kind == "signed":
        reach = wording.round_up(float(np.percentile(np.abs(values), 99.5)))
        return (-reach, reach)
    low, high = (float(v) for v in np.percentile(values, [0.5, 99.5]))
    if 0 <= low < 0.5 * high or high <= low:
        return (0.0, wording.round_up(high))
    step = wording.nice_step(high - low, 8)
    return (float(np.floor(low / step) * step), float(np.ceil(high / step) * step))


def reference_speed(typical: float) -> float:
    """A round speed near the typical one, for the reference arrow."""
    step = wording.nice_step(typical, 1) if typical > 0 else 1.0
    return step if step <= typical * 1.5 else step / 2


def _iso_of(field, name, levels):
    shown = None if levels else work.quick_map(field, name)
    low, high = levels or (levels_of(shown) if shown else (0.0, 1.0))
    return work.iso_lines(field, name, wording.nice_step(high - low, 12))


def _unmeasured(session, measured) -> tuple:
    """The regions whose full numbers are not there yet."""

    def holds(found: Measured | None, region) -> bool:
        return found is not None and found.whole and found.region == region and found.line == session.line

    return tuple(r for r in session.regions if not holds(measured.get(r.name), r))
