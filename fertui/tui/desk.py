"""Where work is done that would keep the screen waiting: one thread with its own open site, one call after the
other."""

from __future__ import annotations

from collections import deque
from collections.abc import Callable
from threading import Condition, Thread
from time import monotonic
from typing import TYPE_CHECKING, Any, NamedTuple

from textual.message import Message

from fertui.refusals import FileTrouble, Refusal

if TYPE_CHECKING:
    from fertui.workbench import Bench


class Answer(NamedTuple):
    """What a call came to: a value, or the sentence that says why there is none (``fault``: an error of the
    program)."""

    value: Any = None
    trouble: str = ""
    fault: BaseException | None = None


class Call(NamedTuple):
    """A piece of work on the open site and what to do with its answer back in the app's own thread.

    ``holds``: keys wait for it, as its answer decides what they mean.
    """

    work: Callable[[Bench], Any]
    then: Callable[[Answer], None]
    name: str = ""
    holds: bool = False


class Came(Message):
    """An answer has come."""

    def __init__(self, call: Call, answer: Answer) -> None:
        super().__init__()
        self.call = call
        self.answer = answer


class Underway(Message):
    """How far a call is that takes its time."""

    def __init__(self, call: Call, doing: str, part: float) -> None:
        super().__init__()
        self.call, self.doing, self.part = call, doing, part


FIRST_SAID_AFTER, SAID_EVERY = 0.5, 0.3
"""Seconds of a call before its progress is told, and between two times that it is: a thin line carries little."""


class Desk:
    """A thread that opens the site on its first call and answers by ``Came``, and by ``Underway`` where that takes its
    time. It never touches a widget."""

    def __init__(self, name: str, open_bench: Callable[[], Bench], post: Callable[[Message], Any]) -> None:
        self._open_bench = open_bench
        self._post = post
        self._calls: deque[Call] = deque()
        self._waiting = Condition()
        # A daemon: leaving the program must not wait for a model that is still running.
        self._thread = Thread(target=self._run, name=name, daemon=True)

    def _hear(self, call: Call, bench: Bench) -> None:
        """Have the bench tell how far it is with a call, now and then."""
        said = monotonic() + FIRST_SAID_AFTER - SAID_EVERY

        def heard(doing: str, part: float) -> None:
            nonlocal said
            if monotonic() - said >= SAID_EVERY:
                said = monotonic()
                self._post(Underway(call, doing, part))

        bench.progress = heard

    def put(self, call: Call) -> None:
        """Add a call; it is answered after those before it."""
        with self._waiting:
            self._calls.append(call)
            if not self._thread.is_alive():
                self._thread.start()
            self._waiting.notify()

    def take_back(self, unwanted: list[Call]) -> list[Call]:
        """Forget calls that have not begun; returns those that could still be taken back."""
        with self._waiting:
            taken = [call for call in self._calls if call in unwanted]
            for call in taken:
                self._calls.remove(call)
        return taken

    def _next(self) -> Call:
        with self._waiting:
            while not self._calls:
                self._waiting.wait()
            return self._calls.popleft()

    def _run(self) -> None:
        bench: Bench | None = None
        while True:
            call = self._next()
            answer, bench = self._answer(call, bench)
            self._post(Came(call, answer))

    def _answer(self, call: Call, bench: Bench | None) -> tuple[Answer, Bench | None]:
        try:
            if bench is None:
                bench = self._open_bench()
            self._hear(call, bench)
            return Answer(call.work(bench)), bench
        except (Refusal, FileTrouble) as no:
            return Answer(trouble=str(no)), bench
        except OSError as no:
            return Answer(trouble=f"{no.strerror or no}: {no.filename or 'the site folder'}. Nothing was lost."), bench
        except Exception as fault:  # the worker boundary: a fault of one view must not end the program
            return Answer(fault=fault), bench
