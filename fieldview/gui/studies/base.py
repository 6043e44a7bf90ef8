"""What the sheets on the whole run share: a start, a stop, and answers from the background."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtWidgets import QComboBox, QDialogButtonBox, QPlainTextEdit

from fieldview.gui.jobs import LATER, Answer
from fieldview.gui.sheets import Sheet


class StudySheet(Sheet):
    """Runs one piece of background work at a time; ``show_result`` gets what comes of it."""

    def __init__(self, window, name: str, title: str, purpose: str):
        super().__init__(window, name, title, purpose)
        self.kind = f"study.{name}"
        self.setSizeGripEnabled(True)
        self.begin = self.buttons.addButton("Start", QDialogButtonBox.ButtonRole.ActionRole)
        self.stop = self.buttons.addButton("Cancel", QDialogButtonBox.ButtonRole.ActionRole)
        self.close_button = self.buttons.addButton(QDialogButtonBox.StandardButton.Close)
        for button in (self.begin, self.stop, self.close_button):
            button.setAutoDefault(False)
        self.begin.clicked.connect(self.start)
        self.stop.clicked.connect(lambda: self.desk.cancel(self.kind))
        self.close_button.clicked.connect(self.close)
        self.desk.jobs.answered.connect(self._answered)
        self.desk.jobs.changed.connect(self._show_state)
        self._show_state()

    def start(self) -> None:
        """Ask for the work; each sheet says with what."""
        raise NotImplementedError

    def show_result(self, value) -> None:
        """Show what came of it."""
        raise NotImplementedError

    def ask(self, work: Callable, *given, title: str) -> None:
        """Ask for ``work(bench, session, *given, report)``; asked again, the earlier request is dropped."""
        session = self.desk.picture.session
        if session is None or self.desk.bench is None:
            return
        self.say("")
        self.desk.jobs.submit(
            self.kind,
            work,
            self.desk.bench,
            session,
            *given,
            urgency=LATER,
            lane="study",
            title=title,
            reports=True,
        )

    def say(self, text: str) -> None:
        """One line below the page."""
        self.problem.setText(text)

    def _answered(self, answer: Answer) -> None:
        if answer.kind != self.kind:
            return
        if answer.failed:
            self.say(answer.error)
        elif answer.value is not None:
            self.show_result(answer.value)

    def _show_state(self) -> None:
        busy = self.desk.jobs.is_pending(self.kind)
        self.begin.setEnabled(not busy)
        self.stop.setEnabled(busy)
        task = next((task for task in self.desk.jobs.tasks if task.kind == self.kind), None)
        if task is not None and task.share is not None:
            self.say(f"{task.title}: {100 * task.share:.0f} %")
        elif busy:
            self.say("working …")

    def _stop(self):
        self.desk.jobs.cancel(self.kind)
        self.desk.jobs.answered.disconnect(self._answered)
        self.desk.jobs.changed.disconnect(self._show_state)
        super()._stop()


def told_text(name: str) -> QPlainTextEdit:
    """Some lines of results, to be read, scrolled and copied."""
    text = QPlainTextEdit()
    text.setObjectName(name)
    text.setAccessibleName("Results in words")
    text.setReadOnly(True)
    text.setTabChangesFocus(True)
    text.setFixedHeight(112)
    return text


def choice(name: str) -> QComboBox:
    """A list to choose from, as wide as its entries."""
    box = QComboBox()
    box.setAccessibleName(name)
    box.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToContents)
    return box
