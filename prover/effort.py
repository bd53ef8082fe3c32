"""How long an engine may try, and where it says what it is doing."""

from __future__ import annotations

import time
from collections.abc import Callable


class OutOfEffort(Exception):
    """An engine's time ran out; the message says what it was doing. Turned into the verdict open."""


class Effort:
    """A deadline shared by the engines of one run, and the line of progress they write."""

    def __init__(self, seconds: float, tell: Callable[[str], None] | None = None) -> None:
        self._end = time.monotonic() + seconds
        self._tell = tell
        self.doing = "starting"

    def say(self, doing: str) -> None:
        """Name the work at hand, and raise OutOfEffort if there is no time for it."""
        self.doing = doing
        if self._tell:
            self._tell(doing)
        self.check()

    def share(self, seconds: float) -> Effort:
        """An effort of so many seconds, or of all that is left if that is less, with the same line of progress."""
        return Effort(min(seconds, self.left), self._tell)

    def check(self) -> None:
        """Raise OutOfEffort past the deadline."""
        if self.left <= 0:
            raise OutOfEffort(f"out of time while {self.doing}")

    @property
    def left(self) -> float:
        """Seconds left, possibly negative."""
        return self._end - time.monotonic()
