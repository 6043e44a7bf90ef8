"""Time strip: a tick per frame with the share measured, the chosen region's trace, and scrubbing."""

from __future__ import annotations

import math

import numpy as np
from PySide6.QtCore import QPointF, QRectF, QSize, Qt, QTimer
from PySide6.QtGui import QColor, QPainter, QPen, QPolygonF
from PySide6.QtWidgets import (
    QButtonGroup,
    QComboBox,
    QHBoxLayout,
    QPushButton,
    QSizePolicy,
    QToolButton,
    QWidget,
)

from fieldview.gui import theme as themes
from fieldview.gui.icons import icon
from fieldview.gui.panels.traces import TRACE_WORDS, trace_of
from fieldview.gui.picture import Picture
from fieldview.gui.theme import LIGHT, Theme

SOURCES = (("frame", "frame"), ("mean", "mean"), ("fluctuation", "fluct."))
SOURCE_TIPS = {
    "frame": "The shown frame as the ledger leaves it",
    "mean": "The mean of the measured vectors over the run",
    "fluctuation": "The shown frame less the run's mean",
}
RATES = (1, 2, 5, 10, 20, 50)


class TimeStrip(QWidget):
    def __init__(self, desk, parent=None):
        super().__init__(parent)
        self.desk = desk
        self.setObjectName("time_strip")
        self.setAccessibleName("Time strip")
        self.setProperty("role", "panel")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        row = QHBoxLayout(self)
        row.setContentsMargins(8, 4, 8, 4)
        row.setSpacing(8)
        self._sources = self._source_buttons(row)
        self.play = QToolButton()
        self.play.setCheckable(True)
        self.play.setProperty("role", "plain")
        self.play.setAccessibleName("Play the frames")
        self.play.setToolTip("Play the frames (a tap on Space)")
        self.play.clicked.connect(self.set_playing)
        row.addWidget(self.play)
        self.rate = QComboBox()
        for rate in RATES:
            self.rate.addItem(f"{rate} / s", rate)
        self.rate.setCurrentIndex(RATES.index(10))
        self.rate.setAccessibleName("Frames per second when playing")
        self.rate.activated.connect(lambda place: self._clock.setInterval(round(1000 / RATES[place])))
        row.addWidget(self.rate)
        self.ruler = Ruler(desk)
        row.addWidget(self.ruler, 1)
        self.trace = QComboBox()
        for choice, words in TRACE_WORDS.items():
            self.trace.addItem(words, choice)
        self.trace.setAccessibleName("Number of the chosen region over time")
        self.trace.setToolTip("Which number of the chosen region is drawn over the frames")
        self.trace.activated.connect(lambda place: desk.show(trace=self.trace.itemData(place)))
        row.addWidget(self.trace)
        self.follow = QPushButton("Follow over run")
        self.follow.setToolTip("Measure the regions on every frame, in the background")
        self.follow.clicked.connect(desk.follow)
        row.addWidget(self.follow)
        self.setFixedHeight(56)
        self._clock = QTimer(self)
        self._clock.setInterval(100)
        self._clock.timeout.connect(self._next)

    def _source_buttons(self, row) -> dict[str, QPushButton]:
        group, made = QButtonGroup(self), {}
        box = QHBoxLayout()
        box.setSpacing(0)
        for source, text in SOURCES:
            button = QPushButton(text)
            button.setCheckable(True)
            button.setAccessibleName(f"Show the {source}")
            button.setToolTip(SOURCE_TIPS[source])
            button.clicked.connect(lambda _=False, source=source: self.desk.show(source=source))
            group.addButton(button)
            box.addWidget(button)
            made[source] = button
        row.addLayout(box)
        return made

    def draw(self, picture: Picture) -> None:
        run = picture.run
        several = run is not None and run.frames > 1
        for source, button in self._sources.items():
            button.setChecked(source == picture.shown.source)
            button.setEnabled(several or (run is not None and source == "frame"))
        self.trace.setCurrentIndex(self.trace.findData(picture.shown.trace))
        for widget in (self.play, self.rate, self.trace):
            widget.setEnabled(several)
        following = any(task.kind == "follow" for task in picture.tasks)
        self.follow.setText("Stop following" if following else "Follow over run")
        self.follow.setEnabled(several)
        self.ruler.draw(picture)

    def set_theme(self, theme: Theme) -> None:
        self.ruler.theme = theme
        self._dress()

    def _dress(self):
        playing = self._clock.isActive()
        self.play.setIcon(icon("pause" if playing else "play", self.ruler.theme))
        self.play.setChecked(playing)

    def set_playing(self, on: bool) -> None:
        """Start or stop playing from the shown frame."""
        run = self.desk.picture.run
        if on and run is not None and run.frames > 1:
            self._clock.start()
        else:
            self._clock.stop()
        self._dress()

    @property
    def playing(self) -> bool:
        return self._clock.isActive()

    def toggle_playing(self) -> None:
        self.set_playing(not self.playing)

    def _next(self):
        picture = self.desk.picture
        if picture.run is None:
            self.set_playing(False)
        elif not self.desk.jobs.is_pending("field"):
            # the next frame is asked for only when the last one has come: playing never piles up work
            self.desk.show(frame=(picture.shown.frame + 1) % picture.run.frames)

    def stop(self) -> None:
        self._clock.stop()


class Ruler(QWidget):
    """The frames themselves: click or drag to go to one."""

    def __init__(self, desk):
        super().__init__()
        self.desk = desk
        self.theme: Theme = LIGHT
        self._picture = Picture()
        self.setObjectName("time_ruler")
        self.setAccessibleName("Frames of the run")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)

    def sizeHint(self):
        return QSize(300, 48)

    def draw(self, picture: Picture) -> None:
        before, self._picture = self._picture, picture
        if (
            before.run is not picture.run
            or before.shown is not picture.shown
            or before.shares is not picture.shares
            or before.traces is not picture.traces
            or before.regions != picture.regions
        ):
            run = picture.run
            if run is not None:
                self.setAccessibleDescription(f"Frame {picture.shown.frame + 1} of {run.frames}")
            self.update()

    def _box(self) -> QRectF:
        return QRectF(8, 2, self.width() - 16, self.height() - 4)

    def frame_x(self, frame: int) -> float:
        """Pixel of a frame's middle."""
        count = self._picture.run.frames if self._picture.run else 1
        box = self._box()
        return box.left() + (frame + 0.5) * box.width() / count

    def paintEvent(self, event):
        picture = self._picture
        if picture.run is None:
            return
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            self._ticks(painter, picture)
            self._trace(painter, picture)
            self._now(painter, picture)

    def _ticks(self, painter, picture):
        count, box = picture.run.frames, self._box()
        step = box.width() / count
        floor, tall = box.bottom() - 2, 13.0
        empty, known = QColor(self.theme.hairline), QColor(self.theme.muted)
        known.setAlphaF(0.75)
        stride = max(1, math.ceil(2.0 / step))
        width = max(1.0, min(step * stride * 0.72, 12.0))
        for frame in range(0, count, stride):
            x = self.frame_x(frame) - width / 2
            painter.fillRect(QRectF(x, floor - tall, width, tall), empty)
            share = picture.shares.get(frame)
            if share is not None:
                painter.fillRect(QRectF(x, floor - tall * share, width, tall * share), known)

    def _trace(self, painter, picture):
        region = picture.selected or (picture.regions[0] if picture.regions else None)
        points = trace_of(picture, region.name) if region is not None else []
        if len(points) < 2:
            return
        values = np.array([value for _, value, _ in points])
        box = self._box()
        low, high = float(values.min()), float(values.max())
        span = high - low if high > low else 1.0
        top, bottom = box.top() + 3, box.bottom() - 20
        place = next(i for i, r in enumerate(picture.regions) if r.name == region.name)
        painter.setPen(QPen(QColor(themes.region_colour(region.colour, place)), 1.5))
        painter.drawPolyline(
            QPolygonF(
                [
                    QPointF(self.frame_x(frame), bottom - (value - low) / span * (bottom - top))
                    for frame, value, _ in points
                ]
            )
        )

    def _now(self, painter, picture):
        x, box = self.frame_x(picture.shown.frame), self._box()
        painter.setPen(QPen(QColor(self.theme.accent), 2))
        painter.drawLine(QPointF(x, box.top()), QPointF(x, box.bottom()))
        painter.setBrush(QColor(self.theme.accent))
        painter.setPen(Qt.PenStyle.NoPen)
        painter.drawPolygon(
            QPolygonF([QPointF(x - 5, box.top()), QPointF(x + 5, box.top()), QPointF(x, box.top() + 6)])
        )
        if self.hasFocus():
            painter.setPen(QPen(QColor(self.theme.accent), 1, Qt.PenStyle.DotLine))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRect(QRectF(self.rect()).adjusted(0.5, 0.5, -0.5, -0.5))

    def mousePressEvent(self, event):
        self.setFocus(Qt.FocusReason.MouseFocusReason)
        self._scrub(event)

    def mouseMoveEvent(self, event):
        if event.buttons() & Qt.MouseButton.LeftButton:
            self._scrub(event)

    def _scrub(self, event):
        run = self._picture.run
        if run is not None:
            box = self._box()
            self.desk.go_to(math.floor((event.position().x() - box.left()) / box.width() * run.frames))

    def keyPressEvent(self, event):
        frame, run = self.desk.picture.shown.frame, self.desk.picture.run
        far = max(1, (run.frames if run else 10) // 10)
        steps = {
            Qt.Key.Key_Left: frame - 1,
            Qt.Key.Key_Right: frame + 1,
            Qt.Key.Key_PageUp: frame + far,
            Qt.Key.Key_PageDown: frame - far,
            Qt.Key.Key_Home: 0,
            Qt.Key.Key_End: run.frames - 1 if run else 0,
        }
        if event.key() in steps:
            self.desk.go_to(steps[event.key()])
        elif event.key() == Qt.Key.Key_Space:
            self.parent().toggle_playing()
        else:
            super().keyPressEvent(event)

    def focusInEvent(self, event):
        super().focusInEvent(event)
        self.update()

    def focusOutEvent(self, event):
        super().focusOutEvent(event)
        self.update()
