"""The line to the terminal: thin in what it sends, forgiving in what it reads, and quiet when the line is gone."""

from __future__ import annotations

import os
import selectors
from codecs import getincrementaldecoder
from typing import Any

from textual._xterm_parser import XTermParser  # the toolkit has no public name for its key parser
from textual.drivers.linux_driver import LinuxDriver
from textual.message import Message

from fertui.tui.slate import Slate


class LineGone(Message):
    """The terminal hung up."""


class Resumed(Message):
    """The program was suspended and goes on: the terminal shows something else."""


class ThinLineDriver(LinuxDriver):
    """The toolkit's terminal driver with a thinner output and an input that survives any bytes and a closed line."""

    def __init__(self, *arguments: Any, **options: Any) -> None:
        super().__init__(*arguments, **options)
        self._slate = Slate(*self._get_terminal_size())

    def write(self, data: str) -> None:
        """Write to the terminal what it does not show already."""
        if thin := self._slate.thin(data):
            super().write(thin)

    def roll(self, top: int, bottom: int, lines: int) -> None:
        """Have the terminal itself shift rows, so that a page scrolled by a line sends that line alone."""
        super().write(self._slate.roll(top, bottom, lines))

    def forget_screen(self) -> None:
        """Send the next repaint whole: the size has changed, or something else wrote on the screen."""
        self._slate = Slate(*self._get_terminal_size())

    def start_application_mode(self) -> None:
        """Take the terminal."""
        self._slate = Slate(*self._get_terminal_size())
        super().start_application_mode()

    def resume_application_mode(self) -> None:
        """Take the terminal again after a pause."""
        super().resume_application_mode()
        self.send_message(Resumed())

    def stop_application_mode(self) -> None:
        """Give the terminal back in its own style."""
        if self._writer_thread is not None and self._writer_thread.is_alive():
            super().write(self._slate.lift())
            super().stop_application_mode()

    def run_input_thread(self) -> None:
        """Read keys until told to stop; bytes that are no text become a mark, the end of the line a message."""
        parser = XTermParser(self._debug)
        decode = getincrementaldecoder("utf-8")("replace").decode
        with selectors.DefaultSelector() as selector:
            selector.register(self.fileno, selectors.EVENT_READ)
            while not self.exit_event.is_set():
                if selector.select(0.1):
                    data = self._read()
                    if not data:
                        self.send_message(LineGone())
                        return
                    for message in parser.feed(decode(data)):
                        self.process_message(message)
                for message in parser.tick():
                    self.process_message(message)

    def _read(self) -> bytes:
        try:
            return os.read(self.fileno, 4096)
        except OSError:  # a pseudo-terminal whose other end is closed
            return b""
