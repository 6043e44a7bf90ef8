"""The times of a run's frames as they come by: evenly spaced or not, and the interval between them."""

from __future__ import annotations

import math

EVEN = 0.01
"""Largest difference between intervals, relative, that still counts as even."""


class Clock:
    """Interval between frames taken in one by one, frames left out counted as gaps."""

    def __init__(self):
        self._first: tuple[int, float] | None = None
        self._last: tuple[int, float] | None = None
        self._steps = 0
        self._shortest, self._longest = math.inf, -math.inf
        self._unknown = False

    def add(self, time: float | None) -> None:
        """The next frame, at this time [s]; None is unknown."""
        if time is None:
            self._unknown = True
        else:
            now = (self._steps, float(time))
            if self._last is not None:
                self._take_in(now)
            self._first = self._first or now
            self._last = now
        self._steps += 1

    def skip(self) -> None:
        """A frame that could not be read."""
        self._steps += 1

    def merge(self, later: Clock) -> None:
        """The frames that follow directly."""
        if later._first is not None:
            first = (self._steps + later._first[0], later._first[1])
            if self._last is not None:
                self._take_in(first)
            self._first = self._first or first
            self._last = (self._steps + later._last[0], later._last[1])
        self._shortest = min(self._shortest, later._shortest)
        self._longest = max(self._longest, later._longest)
        self._unknown |= later._unknown
        self._steps += later._steps

    @property
    def even(self) -> bool:
        """Whether the times are known, run forward and are evenly spaced."""
        return not self._unknown and self._shortest > 0 and self._longest < (1 + EVEN) * self._shortest

    @property
    def interval(self) -> float | None:
        """Mean time between frames [s]; None where the times are unknown or uneven."""
        if not self.even or self._last[0] == self._first[0]:
            return None
        return (self._last[1] - self._first[1]) / (self._last[0] - self._first[0])

    def remarks(self) -> list[str]:
        if self._unknown:
            return ["the times of the frames are not known: time scales are in frames"]
        if self._steps > 1 and not self.even:
            return ["the frames are not evenly spaced in time: time scales are in frames"]
        return []

    def _take_in(self, now: tuple[int, float]) -> None:
        step = (now[1] - self._last[1]) / (now[0] - self._last[0])
        self._shortest, self._longest = min(self._shortest, step), max(self._longest, step)
