"""Calibration sheet: pixels become metres, pulses seconds; and how the axes lie."""

from __future__ import annotations

import math

from PySide6.QtWidgets import QComboBox, QDialogButtonBox, QFormLayout, QLineEdit, QPushButton

from fieldview.compute.errors import InputError
from fieldview.gui.desk import checked
from fieldview.gui.forms import number_text, read_number
from fieldview.gui.panels.base import label
from fieldview.gui.sheets import Sheet, in_a_row, number_entry
from fieldview.session.convert import set_calibration
from fieldview.session.regions import Line
from fieldview.session.steps import Calibrate, TurnAxes


class CalibrationSheet(Sheet):
    def __init__(self, window):
        super().__init__(
            window,
            "calibration_sheet",
            "Calibration and axes",
            "Changing the calibration converts every number of the session, in one step that can be undone.",
        )
        self.resize(500, 540)
        form = QFormLayout()
        form.setVerticalSpacing(6)
        form.addRow(label("Scale", "heading"))
        self.scale = [number_entry("Scale along x"), number_entry("Scale along y")]
        form.addRow(label("mm per pixel, x and y"), in_a_row(*self.scale))
        self.distance, self.pixels = (
            number_entry("Known distance in mm"),
            number_entry("The same distance in pixels"),
        )
        self.take = QPushButton("From the chosen line")
        self.take.setToolTip("Length of the line region that is chosen on the canvas")
        self.take.setAutoDefault(False)
        self.take.clicked.connect(self._take_line)
        self.point = QPushButton("Click on the canvas")
        self.point.setToolTip("Click the two ends of the known distance")
        self.point.setAutoDefault(False)
        self.point.clicked.connect(self._point_out_distance)
        self.axes = QComboBox()
        self.axes.setAccessibleName("Axes that the distance scales")
        for words, value in (("both axes", (0, 1)), ("x only", (0,)), ("y only", (1,))):
            self.axes.addItem(words, value)
        self.use = QPushButton("Use")
        self.use.setAutoDefault(False)
        self.use.setAccessibleName("Use this distance as the scale")
        self.use.clicked.connect(self._use_distance)
        form.addRow(label("known distance [mm] over [px]"), in_a_row(self.distance, self.pixels, self.use))
        form.addRow("", in_a_row(self.point, self.take, self.axes))
        self.scale_u = number_entry("Uncertainty of the scale, relative")
        form.addRow(label("its standard uncertainty, relative"), self.scale_u)
        form.addRow(label("Time", "heading"))
        self.pulse, self.pulse_u = number_entry("Pulse separation"), number_entry("Its uncertainty, relative")
        form.addRow(label("pulse separation [ms]"), self.pulse)
        form.addRow(label("its standard uncertainty, relative"), self.pulse_u)
        self.interval = number_entry("Frame interval")
        form.addRow(label("frame interval [s]"), self.interval)
        form.addRow(label("Axes", "heading"))
        self.origin = [number_entry("Origin, column"), number_entry("Origin, row")]
        self.point_origin = QPushButton("Click")
        self.point_origin.setAccessibleName("Click the origin on the canvas")
        self.point_origin.setAutoDefault(False)
        self.point_origin.clicked.connect(self._point_out_origin)
        form.addRow(label("pixel that becomes (0, 0)"), in_a_row(*self.origin, self.point_origin))
        self.angle = number_entry("Turn of the axes")
        form.addRow(label("turn, counter-clockwise [°]"), self.angle)
        self.reflect = QComboBox()
        self.reflect.setAccessibleName("Axis that is reversed")
        for words, value in (("none reversed", None), ("x reversed", "x"), ("y reversed", "y")):
            self.reflect.addItem(words, value)
        self.reflect.activated.connect(lambda _: self._say_sign(self.desk.picture))
        form.addRow(label("reflection"), self.reflect)
        self.sign = label("", "history", wrap=True)
        self.sign.setAccessibleName("Sign of the strongest vorticity")
        form.addRow("", self.sign)
        self.column.addLayout(form)
        self.column.addStretch()
        apply = self.buttons.addButton("Apply", QDialogButtonBox.ButtonRole.ApplyRole)
        close = self.buttons.addButton(QDialogButtonBox.StandardButton.Close)
        apply.setDefault(True)
        apply.clicked.connect(self.apply)
        close.clicked.connect(self.close)
        self._shown: tuple | None = None
        self.draw(self.desk.picture)

    def draw(self, picture) -> None:
        session = picture.session
        if session is None:
            return
        metric = picture.run is not None and picture.run.units == "m, s"
        offered = (self.use, self.point, self.axes, self.point_origin)
        for entry in (*self.scale, self.pulse, *self.origin, self.distance, self.pixels, *offered):
            entry.setEnabled(not metric)
            entry.setToolTip("The run is in metres and seconds already" if metric else "")
        turned = any(isinstance(s, TurnAxes) and s.on for s in session.ledger)
        self.point_origin.setEnabled(not metric and not turned)
        self.take.setEnabled(not metric and picture.selected is not None and picture.selected.shape == "line")
        self._say_sign(picture)
        parts = (session.ledger, session.error_model, session.run.reading)
        if self._shown is not None and all(a is b for a, b in zip(parts, self._shown, strict=True)):
            return
        self._shown = parts
        calibrate, turn = _step(session, Calibrate), _step(session, TurnAxes)
        _fill(self.scale, [1e3 * s for s in calibrate.scale] if calibrate else [None, None])
        _fill([self.pulse], [1e3 * calibrate.pulse_separation if calibrate else None])
        _fill(self.origin, calibrate.origin if calibrate else [None, None])
        _fill([self.angle], [turn.angle_deg if turn else None])
        self.reflect.setCurrentIndex(self.reflect.findData(turn.reflect if turn else None))
        systematic = session.error_model.systematic
        _fill([self.scale_u, self.pulse_u], [systematic.scale, systematic.pulse_separation])
        _fill([self.interval], [session.run.reading.frame_interval])

    def _say_sign(self, picture) -> None:
        """What a reflection would do to the sign of the strongest vorticity, before it is applied."""
        import numpy as np

        shown = picture.map
        if shown is None or shown.name != "vorticity" or not np.isfinite(shown.values).any():
            self.sign.setText("Show the vorticity map (2) to see the sign of the strongest vorticity here.")
            return
        strongest = shown.values.flat[np.nanargmax(np.abs(shown.values))]
        turn = _step(picture.session, TurnAxes)
        flips = (turn.reflect if turn and turn.on else None) is None
        after = self.reflect.currentData() is None
        now = "counter-clockwise (+)" if strongest > 0 else "clockwise (−)"
        then = now
        if flips != after:
            then = "clockwise (−)" if strongest > 0 else "counter-clockwise (+)"
        change = "and stays so" if then == now else f"and would read {then}"
        self.sign.setText(f"The strongest vortex turns {now} now {change}.")

    def _take_line(self) -> None:
        region = self.desk.picture.selected
        if region is not None and region.shape == "line":
            self.pixels.setText(number_text(self._in_pixels(region).outline().length))

    def _point_out_distance(self) -> None:
        def measure(ends) -> None:
            if ends[0] != ends[1]:
                line = Line(name="known distance", points=tuple((z.real, z.imag) for z in ends))
                self.pixels.setText(f"{self._in_pixels(line).outline().length:.6g}")
            self._come_back()

        self.window_.pick(2, "Click the two ends of the known distance; Esc gives up.", measure)

    def _point_out_origin(self) -> None:
        def take(places) -> None:
            at = places[0]
            line = Line(name="origin", points=((at.real, at.imag), (at.real + 1, at.imag)))
            x, y = self._in_pixels(line).points[0]
            down = self.desk.picture.session.run.reading.y_axis == "down"
            for entry, value in zip(self.origin, (x, -y if down else y), strict=True):
                entry.setText(f"{value:.6g}")
            self._come_back()

        self.window_.pick(1, "Click the place that becomes (0, 0); Esc gives up.", take)

    def _come_back(self) -> None:
        self.raise_()
        self.activateWindow()

    def _in_pixels(self, line):
        """A line in the run's pixels, whatever units the session is in now."""
        session = self.desk.picture.session
        if _step(session, Calibrate) is None:
            return line
        alone = session.model_copy(update={"regions": (line,)}).in_folder(session.folder)
        return set_calibration(alone, None).regions[0]

    def _use_distance(self) -> None:
        distance, pixels = read_number(self.distance.text()), read_number(self.pixels.text())
        if not isinstance(distance, float) or not isinstance(pixels, float) or distance <= 0 or pixels <= 0:
            self.problem.setText("Give the known distance and its length in pixels as positive numbers.")
            return
        self.problem.setText("")
        for axis in self.axes.currentData():
            _fill([self.scale[axis]], [distance / pixels])

    def apply(self) -> None:
        """Put calibration, axes and their uncertainties into the session in one edit."""
        try:
            session = self._entered(self.desk.picture.session)
        except InputError as error:
            self.problem.setText(str(error))
            return
        self.problem.setText("")
        self.desk.commit("Change calibration and axes", session)

    def _entered(self, session):
        calibration = self._calibration(session)
        if calibration != _step(session, Calibrate):
            session = set_calibration(session, calibration)
        ledger = [s for s in session.ledger if not isinstance(s, TurnAxes)]
        turn = _step(session, TurnAxes) or TurnAxes()
        angle = _read(self.angle, "turn") or 0.0
        turn = turn.model_copy(update={"angle_deg": angle, "reflect": self.reflect.currentData()})
        if turn.model_copy(update={"on": True}) != TurnAxes():
            ledger.insert(sum(isinstance(s, Calibrate) for s in ledger), turn)
        systematic = session.error_model.systematic.model_copy(
            update={
                "scale": _read(self.scale_u, "uncertainty of the scale"),
                "pulse_separation": _read(self.pulse_u, "uncertainty of the pulse separation"),
            }
        )
        reading = session.run.reading.model_copy(
            update={"frame_interval": _read(self.interval, "frame interval")}
        )
        return checked(
            session,
            ledger=tuple(ledger),
            error_model=session.error_model.model_copy(update={"systematic": systematic}),
            run=session.run.model_copy(update={"reading": reading}),
        )

    def _calibration(self, session) -> Calibrate | None:
        scale = [_read(entry, "scale") for entry in self.scale]
        pulse = _read(self.pulse, "pulse separation")
        if scale[0] is None and scale[1] is None and pulse is None:
            return None
        if scale[0] is None or pulse is None:
            raise InputError("a calibration needs both a scale and a pulse separation; give the other too")
        if min(s for s in (*scale, pulse) if s is not None) <= 0:
            raise InputError("scale and pulse separation must be positive numbers")
        x, y = (s * 1e-3 for s in (scale[0], scale[0] if scale[1] is None else scale[1]))
        before = _step(session, Calibrate)
        return Calibrate(
            on=before.on if before else True,
            metres_per_pixel=x if math.isclose(x, y, rel_tol=1e-12) else (x, y),
            pulse_separation=pulse * 1e-3,
            origin=tuple(_read(entry, "origin") or 0.0 for entry in self.origin),
        )


def _step(session, model):
    return next((s for s in session.ledger if isinstance(s, model)), None)


def _fill(entries, values) -> None:
    for entry, value in zip(entries, values, strict=True):
        entry.setText("" if value is None else number_text(value))


def _read(entry: QLineEdit, what: str) -> float | None:
    value = read_number(entry.text())
    if isinstance(value, str):
        raise InputError(f'{what} is "{value}"; give a number')
    return value
