"""The status line: frame and shares on the left, background work in the middle, saved or not on the right."""

from __future__ import annotations

import time

from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QHBoxLayout, QLabel, QProgressBar, QPushButton, QStatusBar, QWidget

from fieldview.compute.field import Status
from fieldview.gui.picture import Picture
from fieldview.publish import wording

PATIENCE = 1.0
"""Seconds after which work shows its progress."""

CANCELLABLE = ("open", "field", "follow", "export", "cards")


class StatusLine(QStatusBar):
    def __init__(self, desk, parent=None):
        super().__init__(parent)
        self._desk, self._field = desk, None
        self.setSizeGripEnabled(False)
        self.setAccessibleName("Status line")
        self.frame, self.shares, self.hint, self.saved = QLabel(), QLabel(), QLabel(), QLabel()
        self.addWidget(self.frame)
        self.addWidget(self.shares)
        self.addWidget(self.hint, 1)
        self.work = _Work(desk)
        self.addPermanentWidget(self.work)
        self.addPermanentWidget(self.saved)

    def draw(self, picture: Picture) -> None:
        self.frame.setText(frame_text(picture))
        if picture.field is not self._field:
            self._field = picture.field
            self.shares.setText(share_text(picture))
        if picture.session is None:
            self.saved.setText("")
        else:
            kept = "saved" if picture.path is not None else "no session file yet"
            self.saved.setText("not saved" if picture.unsaved else kept)
        self.work.draw(picture)


class _Work(QWidget):
    """The longest-standing background work past a second: name, bar, time left, Cancel."""

    def __init__(self, desk):
        super().__init__()
        self._desk = desk
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(6)
        self.text = QLabel()
        self.bar = QProgressBar()
        self.bar.setTextVisible(False)
        self.bar.setFixedWidth(110)
        self.bar.setAccessibleName("Progress of background work")
        self.cancel = QPushButton("Cancel")
        self.cancel.setAccessibleName("Cancel the background work")
        self.cancel.setFixedHeight(20)
        self.cancel.setStyleSheet("padding: 0 8px; min-height: 14px;")
        self.cancel.clicked.connect(self._cancel)
        for widget in (self.text, self.bar, self.cancel):
            row.addWidget(widget)
        self._task = None
        self._tasks = ()
        self._clock = QTimer(self)
        self._clock.setSingleShot(True)
        self._clock.timeout.connect(self._show)
        self._hide()

    def draw(self, picture: Picture) -> None:
        if picture.tasks is not self._tasks:
            self._tasks = picture.tasks
            self._show()

    def _show(self):
        now = time.monotonic()
        waiting = [task for task in self._tasks if task.title]
        self._task = next((task for task in waiting if now - task.since >= PATIENCE), None)
        if self._task is None:
            self._hide()
            if waiting:
                self._clock.start(int(1000 * PATIENCE))
            else:
                self._clock.stop()
            return
        task = self._task
        left = wording.time_left(task.share, now - task.since) if task.share else ""
        self.text.setText(task.title + (f" · {left}" if left else " …"))
        self.bar.setRange(0, 1000 if task.share else 0)
        self.bar.setValue(round(1000 * (task.share or 0)))
        self.cancel.setVisible(task.kind in CANCELLABLE)
        for widget in (self.text, self.bar):
            widget.show()

    def _hide(self):
        for widget in (self.text, self.bar, self.cancel):
            widget.hide()

    def _cancel(self):
        if self._task is not None:
            self._desk.cancel(self._task.kind)


def frame_text(picture: Picture) -> str:
    run, shown = picture.run, picture.shown
    if run is None:
        return ""
    if shown.source == "mean":
        return f"mean of {run.frames:,} frames"
    time_of = run.times[shown.frame] if shown.frame < len(run.times) else None
    clock = f" · t = {time_of:.3f} s" if time_of is not None else ""
    less = " less the mean" if shown.source == "fluctuation" else ""
    return f"frame {shown.frame + 1:,} of {run.frames:,}{less}{clock}"


def share_text(picture: Picture) -> str:
    field = picture.field
    if field is None:
        return ""
    total = field.status.size - field.count(Status.MASKED)
    if not total:
        return "every node is masked"
    parts = [
        f"{100 * field.count(status) / total:.1f} % {word}"
        for status, word in (
            (Status.MEASURED, "measured"),
            (Status.FILLED, "filled"),
            (Status.REJECTED, "rejected"),
            (Status.MISSING, "missing"),
        )
        if field.count(status)
    ]
    return ", ".join(parts)
