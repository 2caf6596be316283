"""Who is at the keyboard: asked at the first write of a session, forgotten after a pause."""

from __future__ import annotations

import time
from collections.abc import Callable

from fertui.logbook.signing import initials


class Initials:
    """The initials in force. ``lasting``: given by the login itself, which belongs to one person."""

    def __init__(self, lasting: str, minutes: int, clock: Callable[[], float] = time.monotonic) -> None:
        self._clock = clock
        self._lasting = initials(lasting) if lasting else ""
        self._pause = minutes * 60.0
        self._given, self._seen = "", 0.0

    @property
    def now(self) -> str:
        """The initials, '' when nobody has said or the pause was too long."""
        if self._lasting:
            return self._lasting
        if self._given and self._clock() - self._seen > self._pause:
            self._given = ""
        return self._given

    def give(self, text: str) -> str:
        """Someone says who they are."""
        self._given, self._seen = initials(text), self._clock()
        return self._given

    def touch(self) -> None:
        """A key was pressed: the pause begins anew, unless it is over already."""
        if self.now:
            self._seen = self._clock()
