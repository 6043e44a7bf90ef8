"""Ledger: what was done to the vectors, line by line, with counts; every line has a switch and settings."""

from __future__ import annotations

import math

from PySide6.QtCore import QPoint, Qt
from PySide6.QtWidgets import (
    QAbstractButton,
    QCheckBox,
    QFrame,
    QGridLayout,
    QHBoxLayout,
    QMenu,
    QScrollArea,
    QSizePolicy,
    QToolButton,
    QVBoxLayout,
    QWidget,
)

from fieldview.compute.units import Units
from fieldview.gui import ledger_edits
from fieldview.gui.forms import ModelForm
from fieldview.gui.panels.base import Panel, label, set_property
from fieldview.gui.panels.switch import Switch
from fieldview.gui.picture import Picture, RunFacts
from fieldview.publish import wording

DRAG_PIXELS = 12


class Ledger(Panel):
    def __init__(self, desk, parent=None):
        super().__init__(desk, "ledger", "Ledger", parent)
        self.add = QToolButton()
        self.add.setText("Add step")
        self.add.setProperty("role", "plain")
        self.add.setAccessibleName("Add a step to the ledger")
        self.add.setPopupMode(QToolButton.ToolButtonPopupMode.InstantPopup)
        self.add.setMenu(self._menu())
        self.heading_row.addStretch()
        self.heading_row.addWidget(self.add)
        self._page = QWidget()
        self._page.setProperty("role", "panel")
        # as wide as the panel, never wider: the lines wrap
        self._page.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)
        self._stack = QVBoxLayout(self._page)
        self._stack.setContentsMargins(0, 0, 0, 0)
        self._stack.setSpacing(0)
        self._stack.addStretch()
        scroll = QScrollArea()
        scroll.setProperty("role", "panel")
        scroll.setFrameShape(QFrame.Shape.NoFrame)
        scroll.setWidgetResizable(True)
        scroll.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        scroll.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        scroll.setWidget(self._page)
        self.column.addWidget(scroll, 1)
        self._run_line = RunLine()
        self._stack.insertWidget(0, self._run_line)
        self.lines: list[LedgerLine] = []
        self.mark = AsOfMark(self)
        self._stack.insertWidget(1, self.mark)

    def _menu(self) -> QMenu:
        menu = QMenu(self)
        for model in ledger_edits.ADDABLE:
            title = ledger_edits.title_of(model)
            action = menu.addAction(title)
            action.setToolTip((model.__doc__ or "").strip().splitlines()[0])
            action.triggered.connect(lambda _=False, model=model: ledger_edits.add(self.desk, model))
        menu.setToolTipsVisible(True)
        return menu

    def draw(self, picture: Picture) -> None:
        self.setEnabled(picture.session is not None)
        self._run_line.draw(picture)
        steps = picture.session.ledger if picture.session else ()
        while len(self.lines) < len(steps):
            line = LedgerLine(self.desk, len(self.lines), self)
            self._stack.insertWidget(1 + len(self.lines), line)
            self.lines.append(line)
        while len(self.lines) > len(steps):
            line = self.lines.pop()
            self._stack.removeWidget(line)
            line.hide()
            line.deleteLater()
        for line in self.lines:
            line.draw(picture)
        self._place_mark(picture)

    def _place_mark(self, picture: Picture) -> None:
        """The mark stands below the last line that is applied."""
        count = len(self.lines) if picture.shown.as_of is None else picture.shown.as_of
        self.mark.setVisible(bool(self.lines))
        if self._stack.indexOf(self.mark) != 1 + count:
            self._stack.removeWidget(self.mark)
            self._stack.insertWidget(1 + count, self.mark)

    def line_at(self, y: int) -> int:
        """Index of the line at a height of the page: before the first 0, beyond the last their number."""
        middles = [line.geometry().center().y() for line in self.lines]
        return sum(y > middle for middle in middles)

    def page_y(self, widget: QWidget, event) -> int:
        """Height on the page of a pointer event in one of its widgets."""
        return widget.mapTo(self._page, event.position().toPoint()).y()


class AsOfMark(QFrame):
    """Where the shown field stands in the ledger: pull it up to see the field before later lines."""

    def __init__(self, ledger: Ledger):
        super().__init__()
        self._ledger = ledger
        self.setObjectName("as_of_mark")
        self.setAccessibleName("As-of mark")
        self.setToolTip("The field is shown as of this line. Drag the mark, or press Up and Down.")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setCursor(Qt.CursorShape.SizeVerCursor)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 2)
        column.setSpacing(0)
        line = QFrame()
        line.setProperty("role", "mark line")
        line.setFixedHeight(2)
        column.addWidget(line)
        words = label("as of here", "mark words")
        words.setAlignment(Qt.AlignmentFlag.AlignRight)
        column.addWidget(words)

    def _pull(self, count: int) -> None:
        lines = len(self._ledger.lines)
        count = min(max(count, 0), lines)
        self._ledger.desk.show(as_of=None if count == lines else count)

    def mousePressEvent(self, event):
        event.accept()

    def mouseReleaseEvent(self, event):
        self._pull(self._ledger.line_at(self._ledger.page_y(self, event)))

    def keyPressEvent(self, event):
        shown = self._ledger.desk.picture.shown.as_of
        count = len(self._ledger.lines) if shown is None else shown
        if event.key() in (Qt.Key.Key_Up, Qt.Key.Key_Down):
            self._pull(count + (1 if event.key() == Qt.Key.Key_Down else -1))
        else:
            super().keyPressEvent(event)


class RunLine(QFrame):
    """The first line: the run itself."""

    def __init__(self):
        super().__init__()
        self.setProperty("role", "ledger line")
        column = QVBoxLayout(self)
        column.setContentsMargins(40, 6, 4, 6)
        column.setSpacing(1)
        self.title = label("", wrap=True)
        self.title.setTextFormat(Qt.TextFormat.RichText)
        self.detail = label("", "muted", wrap=True)
        column.addWidget(self.title)
        column.addWidget(self.detail)

    def draw(self, picture: Picture) -> None:
        run = picture.run
        if picture.session is None:
            self.title.setText("")
            self.detail.setText("Nothing is open.")
            return
        name = picture.session.title or picture.session.run.files[0]
        if run is None:
            self.title.setText(f"<b>Run</b> {escaped(name)}")
            self.detail.setText("opening …")
            return
        frames = "1 frame" if run.frames == 1 else f"{run.frames:,} frames"
        ny, nx = run.shape
        self.title.setText(f"<b>Run</b> {escaped(name)}: {frames}, {nx} × {ny} nodes")
        remarks = "1 remark" if len(run.notes) == 1 else f"{len(run.notes)} remarks"
        parts = [*grid_words(run), *([f"{remarks} on reading"] if run.notes else [])]
        self.detail.setText(" · ".join(parts))
        self.detail.setToolTip("\n".join(run.notes))


def grid_words(run: RunFacts) -> list[str]:
    """Spacing, unit of the vectors and frame rate, as far as they are known."""
    length = run.units.split(",")[0]
    near = length == "m" and all(not math.isfinite(s) or s < 0.1 for s in run.spacing)
    gaps = [wording.short(1e3 * s if near else s) for s in run.spacing if math.isfinite(s)]
    words = [f"{' × '.join(dict.fromkeys(gaps))} {'mm' if near else length} apart"] if gaps else []
    words.append({"m, s": "m/s", "px, pulse": "px per pulse"}.get(run.units, run.units))
    times = run.times
    if len(times) > 1 and None not in (times[0], times[-1]) and times[-1] > times[0]:
        words.append(f"{wording.short((len(times) - 1) / (times[-1] - times[0]))} Hz")
    return words


class LedgerLine(QFrame):
    """One step: switch, number, sentence, what it did; chosen, its settings below."""

    def __init__(self, desk, number: int, ledger: Ledger):
        super().__init__(ledger)
        self._desk, self._ledger, self.number = desk, ledger, number
        self.setProperty("role", "ledger line")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self._pressed: QPoint | None = None
        self._seen: tuple | None = None
        grid = QGridLayout(self)
        grid.setContentsMargins(0, 6, 4, 6)
        grid.setHorizontalSpacing(6)
        grid.setVerticalSpacing(1)
        grid.setColumnStretch(2, 1)
        self.switch: QCheckBox | QAbstractButton = Switch()
        self.switch.clicked.connect(lambda on: ledger_edits.switch(desk, self.number, on))
        self.place = label("", "muted")
        self.title = label("", wrap=True)
        self.title.setTextFormat(Qt.TextFormat.RichText)
        self.outcome = label("", "muted", wrap=True)
        top = Qt.AlignmentFlag.AlignTop
        grid.addWidget(self.switch, 0, 0, top)
        grid.addWidget(self.place, 0, 1, top)
        grid.addWidget(self.title, 0, 2)
        grid.addWidget(self.outcome, 1, 2)
        self.form = ModelForm(lambda step: ledger_edits.change(desk, self.number, step))
        self.form.hide()
        grid.addWidget(self.form, 2, 1, 1, 2)
        self.buttons = self._buttons()
        self.buttons.hide()
        grid.addWidget(self.buttons, 3, 1, 1, 2)

    def _buttons(self) -> QWidget:
        box = QWidget()
        row = QHBoxLayout(box)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(4)
        for text, tip, change in (
            ("↑", "Move this line up (Alt+Up)", lambda: ledger_edits.move(self._desk, self.number, -1)),
            ("↓", "Move this line down (Alt+Down)", lambda: ledger_edits.move(self._desk, self.number, 1)),
            (
                "As of",
                "Show the field as of this line",
                lambda: ledger_edits.as_of(self._desk, self.number),
            ),
            ("✕", "Take this line out (Delete)", lambda: ledger_edits.remove(self._desk, self.number)),
        ):
            button = QToolButton()
            button.setText(text)
            button.setToolTip(tip)
            button.setAccessibleName(tip)
            button.setProperty("role", "plain")
            button.clicked.connect(change)
            button.setSizePolicy(QSizePolicy.Policy.Maximum, QSizePolicy.Policy.Fixed)
            row.addWidget(button)
        row.addStretch()
        return box

    def draw(self, picture: Picture) -> None:
        step = picture.session.ledger[self.number]
        tally = next((t for t in picture.tallies if t.line == self.number and t.step == step.step), None)
        seen = (step, tally, picture.shown.line, picture.shown.as_of, picture.stale, colour_of(self, False))
        if self._seen is None or any(a is not b for a, b in zip(seen, self._seen, strict=True)):
            self._seen = seen
            self._show(picture, step, tally)

    def _show(self, picture: Picture, step, tally) -> None:
        from fieldview.session.ledger import sentence

        beyond = picture.shown.as_of is not None and self.number >= picture.shown.as_of
        words = sentence(step)
        title = ledger_edits.title_of(type(step))
        colour = colour_of(self, beyond or not step.on)
        head, rest = (title, words[len(title) :]) if words.startswith(title) else words.split(" ", 1)
        gap = "" if rest.startswith((",", " ")) else " "
        self.title.setText(f'<span style="color:{colour}"><b>{escaped(head)}</b>{gap}{escaped(rest)}</span>')
        self.place.setText(str(self.number + 1))
        self.switch.setChecked(step.on)
        self.switch.setAccessibleName(f"Line {self.number + 1}, {words}")
        self.setAccessibleName(f"Line {self.number + 1}: {words}")
        self.outcome.setText(_outcome(step, tally, beyond, picture.stale))
        chosen = picture.shown.line == self.number
        set_property(self, "chosen", chosen)
        if chosen:
            units = Units.parse(picture.session.units) if picture.session.units else None
            self.form.show_model(step, units)
        self.form.setVisible(chosen)
        self.buttons.setVisible(chosen)

    def mousePressEvent(self, event):
        if event.button() == Qt.MouseButton.LeftButton:
            self._pressed = event.position().toPoint()
            self.setFocus(Qt.FocusReason.MouseFocusReason)

    def mouseMoveEvent(self, event):
        if self._pressed is not None and self._far(event):
            self.setCursor(Qt.CursorShape.ClosedHandCursor)

    def mouseReleaseEvent(self, event):
        pressed, far = self._pressed, self._pressed is not None and self._far(event)
        self._pressed = None
        self.unsetCursor()
        if pressed is None or event.button() != Qt.MouseButton.LeftButton:
            return
        if far:
            target = self._ledger.line_at(self._ledger.page_y(self, event))
            # the line itself leaves a gap when it moves down
            ledger_edits.move(self._desk, self.number, target - self.number - (target > self.number))
        else:
            self.toggle()

    def _far(self, event) -> bool:
        return (event.position().toPoint() - self._pressed).manhattanLength() >= DRAG_PIXELS

    def toggle(self) -> None:
        """Open this line's settings, or close them."""
        chosen = self._desk.picture.shown.line == self.number
        self._desk.show(line=None if chosen else self.number)

    def keyPressEvent(self, event):
        alt = event.modifiers() & Qt.KeyboardModifier.AltModifier
        match event.key():
            case Qt.Key.Key_Return | Qt.Key.Key_Enter | Qt.Key.Key_Space:
                self.toggle()
            case Qt.Key.Key_Up if alt:
                ledger_edits.move(self._desk, self.number, -1)
            case Qt.Key.Key_Down if alt:
                ledger_edits.move(self._desk, self.number, 1)
            case Qt.Key.Key_Delete:
                ledger_edits.remove(self._desk, self.number)
            case _:
                super().keyPressEvent(event)


def colour_of(widget: QWidget, muted: bool) -> str:
    """The colour of a line's words: quiet where it takes no part."""
    panel = widget.parent()
    while panel is not None and not isinstance(panel, Panel):
        panel = panel.parent()
    theme = panel.theme if panel is not None else None
    return (theme.muted if muted else theme.text) if theme is not None else "palette(text)"


def _outcome(step, tally, beyond: bool, stale: bool) -> str:
    if not step.on:
        return "switched off"
    if beyond:
        return "after the as-of mark"
    if tally is None:
        return "working …" if stale else ""
    took = f" · {1e3 * tally.seconds:.1f} ms" if tally.seconds > 0 else ""
    return f"{tally.outcome}{took}"


def escaped(text: str) -> str:
    return text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
