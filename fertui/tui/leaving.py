"""How the program ends when it is told to from outside: at once, tidily where that can be done, in any case soon."""

from __future__ import annotations

import asyncio
import os
import signal
from collections.abc import Callable
from threading import Timer

LEAVE_WITHIN = 1.5
"""Seconds after which a program that could not leave tidily (a terminal that takes no more bytes) leaves anyway."""


HUNG_UP = 128 + signal.SIGHUP
"""Exit code after the line was cut."""


def exit_code(number: int) -> int:
    """What a shell expects of a program that a signal ended."""
    return 128 + number


def on_signals(leave: Callable[[int], None]) -> None:
    """Call ``leave`` with the exit code when the line hangs up or the system asks to end."""
    loop = asyncio.get_running_loop()
    for number in (signal.SIGHUP, signal.SIGTERM, signal.SIGINT):
        loop.add_signal_handler(number, leave, exit_code(number))


def leave_soon(code: int) -> None:
    """See to it that the process ends within ``LEAVE_WITHIN`` seconds, whatever still runs."""
    timer = Timer(LEAVE_WITHIN, os._exit, args=(code,))
    timer.daemon = True
    timer.start()
