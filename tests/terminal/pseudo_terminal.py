"""A person at a terminal, for tests: starts the program in a pseudo-terminal, presses keys, reads the screen."""

from __future__ import annotations

import contextlib
import fcntl
import os
import pty
import select
import signal
import struct
import termios
import time
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Protocol

import pyte

KEYS = {
    "up": "\x1b[A", "down": "\x1b[B", "right": "\x1b[C", "left": "\x1b[D", "enter": "\r", "tab": "\t", "space": " ",
    "backspace": "\x7f", "home": "\x1b[H", "end": "\x1b[F", "pageup": "\x1b[5~", "pagedown": "\x1b[6~",
    "delete": "\x1b[3~", "shift+tab": "\x1b[Z", "esc": "\x1b[27u", "bare esc": "\x1b", "f1": "\x1bOP", "f2": "\x1bOQ",
    "f3": "\x1bOR", "f4": "\x1bOS", "f5": "\x1b[15~", "ctrl+d": "\x04", "ctrl+q": "\x11", "ctrl+z": "\x1a",
    "ctrl+c": "\x03", "ctrl+o": "\x0f", "ctrl+r": "\x12", "ctrl+x": "\x18",
}  # fmt: skip
"""What a terminal sends. An Esc that says so itself need not be waited for; the bare one is one if nothing follows."""
DEADLINE = 15.0
"""Seconds after which a screen that does not come is a failure."""
QUIET = 0.03
"""Seconds without a byte and without work after which a program waits for keys: it paints 60 times a second."""
AT_REST = 2_000_000
"""Work [ns of processor time] in that while that is no more than looking for keys."""


class Process(Protocol):
    """A program in a terminal."""

    pid: int

    def ended(self) -> int | None:
        """Its exit code (negative: the signal that ended it), None while it runs."""


class Command:
    """A program started by its command line. Starts a process in the terminal of that name."""

    def __init__(self, command: Sequence[str]) -> None:
        self._command = list(command)

    def __call__(self, terminal: str, environment: Mapping[str, str], folder: Path) -> Process:
        """Start it."""
        self.pid = os.fork()
        if self.pid == 0:
            enter_terminal(os.open(terminal, os.O_RDWR | os.O_NOCTTY))
            os.chdir(folder)
            os.execvpe(self._command[0], self._command, dict(environment))
        return self

    def ended(self) -> int | None:
        """Its exit code, None while it runs."""
        pid, status = os.waitpid(self.pid, os.WNOHANG)
        return os.waitstatus_to_exitcode(status) if pid else None


Start = Callable[[str, Mapping[str, str], Path], Process]


def enter_terminal(line: int) -> None:
    """Make an open terminal that of a new session of this process."""
    os.setsid()
    fcntl.ioctl(line, termios.TIOCSCTTY, 0)
    for number in range(3):
        os.dup2(line, number)
    if line > 2:
        os.close(line)


class PseudoTerminal:
    """One run of a program in a terminal of its own."""

    def __init__(
        self,
        start: Start,
        size: tuple[int, int] = (80, 24),
        environment: Mapping[str, str] | None = None,
        folder: Path | None = None,
    ) -> None:
        self.screen = pyte.Screen(*size)
        self._stream = pyte.ByteStream(self.screen)
        self.sent = bytearray()
        self.exit_code: int | None = None
        self.hung_up = False
        self.line, other_end = pty.openpty()
        fcntl.ioctl(self.line, termios.TIOCSWINSZ, struct.pack("HHHH", size[1], size[0], 0, 0))
        self._process = start(os.ttyname(other_end), _environment(environment or {}), folder or Path.cwd())
        self.pid = self._process.pid
        os.close(other_end)

    def __enter__(self) -> PseudoTerminal:
        return self

    def __exit__(self, *_: object) -> None:
        if self.exit_code is None:
            os.kill(self.pid, signal.SIGKILL)
            self._end(DEADLINE)
        with contextlib.suppress(OSError):
            os.close(self.line)

    def read(self, timeout: float) -> bool:
        """Take in what the program sends within ``timeout`` seconds; False when nothing came or it has ended."""
        if not select.select([self.line], [], [], timeout)[0]:
            return False
        try:
            data = os.read(self.line, 65536)
        except OSError:
            return False
        self.sent += data
        self._stream.feed(data)
        return bool(data)

    def until(self, condition: Callable[[str], bool], deadline: float = DEADLINE) -> str:
        """Read until the text of the screen fulfils a condition; fails with the screen when it never does."""
        end = time.monotonic() + deadline
        while not condition(self.text):
            if time.monotonic() > end:
                raise AssertionError(f"the screen never showed it:\n{self.text}")
            if not self.read(0.05) and self._states() == {"Z"}:
                raise AssertionError(f"the program has ended:\n{self.text}")
        return self.text

    def until_text(self, text: str) -> str:
        """Read until the screen shows a text."""
        return self.until(lambda shown: text in shown)

    def settle(self, quiet: float = QUIET) -> int:
        """Read until nothing comes and the program is at rest; returns the bytes since the call."""
        before = len(self.sent)
        while True:
            work = self._work()
            if not self.read(quiet) and self._work() - work < AT_REST and not self._busy():
                return len(self.sent) - before

    def press(self, *keys: str) -> int:
        """Press keys (names of ``KEYS`` or texts), wait for rest after each; returns the bytes that came."""
        before = len(self.sent)
        for key in keys:
            self.type(KEYS.get(key, key).encode())
            self.settle()
        return len(self.sent) - before

    def type(self, data: bytes) -> None:
        """Send bytes as a keyboard would."""
        os.write(self.line, data)

    def resize(self, columns: int, rows: int) -> None:
        """Give the terminal another size."""
        self.screen.resize(rows, columns)
        fcntl.ioctl(self.line, termios.TIOCSWINSZ, struct.pack("HHHH", rows, columns, 0, 0))
        os.kill(self.pid, signal.SIGWINCH)

    def signal(self, number: int) -> None:
        """Send the program a signal."""
        os.kill(self.pid, number)

    def until_stopped(self) -> None:
        """Read until the program is suspended, and all it sent before."""
        self.until(lambda _: self._states() == {"T"})
        while self.read(0):
            pass

    def hang_up(self) -> None:
        """Close our end of the line."""
        os.close(self.line)
        self.hung_up = True

    def wait(self, deadline: float = DEADLINE) -> int:
        """Wait for the end of the program; returns its exit code (negative: the signal that ended it)."""
        return self._end(deadline)

    def _end(self, deadline: float) -> int:
        end = time.monotonic() + deadline
        while (code := self._process.ended()) is None:
            assert time.monotonic() < end, f"the program has not ended after {deadline} s"
            if self.hung_up:
                os.sched_yield()
            else:
                self.read(0.02)
        self.exit_code = code
        return code

    def _threads(self, file: str) -> list[str]:
        """What the system tells of each thread of the program; nothing of one that has ended."""
        texts = []
        for path in Path(f"/proc/{self.pid}/task").glob(f"*/{file}"):
            with contextlib.suppress(OSError):
                texts.append(path.read_text())
        return texts

    def _work(self) -> int:
        """Processor time the program has taken [ns]."""
        return sum(int(text.split()[0]) for text in self._threads("schedstat"))

    def _busy(self) -> bool:
        """Whether a thread runs, waits for a processor or for a disk."""
        return bool(self._states() & {"R", "D"})

    def _states(self) -> set[str]:
        """States of its threads, in the letters of the system."""
        return {text.rpartition(")")[2].split()[0] for text in self._threads("stat")}

    @property
    def text(self) -> str:
        """The screen as text, without trailing blanks."""
        return "\n".join(row.rstrip() for row in self.screen.display)


def _environment(own: Mapping[str, str]) -> dict[str, str]:
    """The environment of the tests with a usual terminal, and without what would change the screens."""
    everything = {**os.environ, "TERM": "xterm-256color", "LANG": "C.UTF-8", **own}
    for name in ("COLORTERM", "LC_ALL", "LC_CTYPE", "NO_COLOR", "COLUMNS", "LINES"):
        if name not in own:
            everything.pop(name, None)
    return everything
