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

import pyte

KEYS = {
    "up": "\x1b[A", "down": "\x1b[B", "right": "\x1b[C", "left": "\x1b[D", "enter": "\r", "tab": "\t", "esc": "\x1b",
    "space": " ", "backspace": "\x7f", "home": "\x1b[H", "end": "\x1b[F", "pageup": "\x1b[5~", "pagedown": "\x1b[6~",
    "delete": "\x1b[3~", "shift+tab": "\x1b[Z", "f1": "\x1bOP", "f2": "\x1bOQ", "f5": "\x1b[15~", "ctrl+d": "\x04",
    "ctrl+q": "\x11", "ctrl+z": "\x1a", "ctrl+c": "\x03", "ctrl+o": "\x0f", "ctrl+r": "\x12", "ctrl+x": "\x18",
}  # fmt: skip
DEADLINE = 15.0
"""Seconds after which a screen that does not come is a failure."""


class PseudoTerminal:
    """One run of a program in a terminal of its own."""

    def __init__(
        self,
        command: Sequence[str],
        size: tuple[int, int] = (80, 24),
        environment: Mapping[str, str] | None = None,
        folder: Path | None = None,
    ) -> None:
        self.screen = pyte.Screen(*size)
        self._stream = pyte.ByteStream(self.screen)
        self.sent = bytearray()
        self.exit_code: int | None = None
        self.hung_up = False
        everything = {**os.environ, "TERM": "xterm-256color", "LANG": "C.UTF-8", **(environment or {})}
        for name in ("COLORTERM", "LC_ALL", "LC_CTYPE", "NO_COLOR", "COLUMNS", "LINES"):
            if name not in (environment or {}):
                everything.pop(name, None)
        self.pid, self.line = pty.fork()
        if self.pid == 0:
            os.chdir(folder or ".")
            fcntl.ioctl(0, termios.TIOCSWINSZ, struct.pack("HHHH", size[1], size[0], 0, 0))
            os.execvpe(command[0], list(command), everything)
        fcntl.ioctl(self.line, termios.TIOCSWINSZ, struct.pack("HHHH", size[1], size[0], 0, 0))

    def __enter__(self) -> PseudoTerminal:
        return self

    def __exit__(self, *_: object) -> None:
        if self.exit_code is None:
            os.kill(self.pid, signal.SIGKILL)
            os.waitpid(self.pid, 0)
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
            self.read(0.05)
        return self.text

    def until_text(self, text: str) -> str:
        """Read until the screen shows a text."""
        return self.until(lambda shown: text in shown)

    def settle(self, quiet: float = 0.15) -> int:
        """Read until nothing has come for ``quiet`` seconds; returns the bytes since the call."""
        before = len(self.sent)
        while self.read(quiet):
            pass
        return len(self.sent) - before

    def press(self, *keys: str) -> int:
        """Press keys (names of ``KEYS`` or texts), wait for quiet; returns the bytes that came."""
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

    def hang_up(self) -> None:
        """Close our end of the line."""
        os.close(self.line)
        self.hung_up = True

    def wait(self, deadline: float = DEADLINE) -> int:
        """Wait for the end of the program; returns its exit code (negative: the signal that ended it)."""
        end = time.monotonic() + deadline
        while time.monotonic() < end:
            pid, status = os.waitpid(self.pid, os.WNOHANG)
            if pid:
                self.exit_code = os.waitstatus_to_exitcode(status)
                return self.exit_code
            if self.hung_up:
                os.sched_yield()
            else:
                self.read(0.02)
        raise AssertionError(f"the program has not ended after {deadline} s")

    @property
    def text(self) -> str:
        """The screen as text, without trailing blanks."""
        return "\n".join(row.rstrip() for row in self.screen.display)
