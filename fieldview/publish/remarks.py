"""What is told to the user on the way, remembered: the exit status says whether there was anything."""

from __future__ import annotations

from collections.abc import Callable

from fieldview.session.replay import Workbench


class Remarks:
    """Called with a sentence it passes that on; true once there was one.

    Parameters
    ----------
    say : callable (sentence)
    benches : Workbench
        Their sources that have changed since the session was saved are said at once.

    Attributes
    ----------
    said : list of str
    """

    def __init__(self, say: Callable[[str], None], *benches: Workbench):
        self._say, self.said = say, []
        for bench in benches:
            for sentence in bench.changed_sources():
                self(sentence)

    def __call__(self, sentence: str) -> None:
        self.said.append(sentence)
        self._say(sentence)

    def __bool__(self) -> bool:
        return bool(self.said)
