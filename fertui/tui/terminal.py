"""What the terminal at hand can do, read from the environment once."""

from __future__ import annotations

import os
from collections.abc import Mapping
from typing import NamedTuple

from fertui.tui.ink import ascii_only

FLOOR = (60, 20)
"""Columns and rows below which a plain message takes the place of the views."""


class Terminal(NamedTuple):
    """What can be shown: ``ascii`` when nothing beyond ASCII, ``colours`` 0, 16 or 256 and more, ``remote`` over
    SSH."""

    ascii: bool = False
    colours: int = 256
    remote: bool = False

    def text(self, text: str) -> str:
        """The text as this terminal can show it, column for column."""
        return ascii_only(text) if self.ascii else text


def read_terminal(environment: Mapping[str, str] = os.environ, ascii_wanted: bool | None = None) -> Terminal:
    """What the environment says; ``ascii_wanted`` is the user's own setting and wins."""
    by_locale = not _speaks_utf8(environment)
    return Terminal(
        ascii=by_locale if ascii_wanted is None else ascii_wanted,
        colours=_colours(environment),
        remote="SSH_CONNECTION" in environment or "SSH_TTY" in environment,
    )


def _speaks_utf8(environment: Mapping[str, str]) -> bool:
    language = environment.get("LANG", "")
    for name in ("LC_ALL", "LC_CTYPE"):
        wanted = environment.get(name, "")
        # Python itself sets LC_CTYPE=C.UTF-8 where the locale is C (PEP 538): that says nothing about the terminal.
        by_python = name == "LC_CTYPE" and wanted in ("C.UTF-8", "C.utf8", "UTF-8") and language in ("", "C", "POSIX")
        if wanted and not by_python:
            return "utf" in wanted.lower()
    return "utf" in language.lower()


def _colours(environment: Mapping[str, str]) -> int:
    if environment.get("NO_COLOR"):
        return 0
    term = environment.get("TERM", "")
    if "256" in term or "direct" in term or environment.get("COLORTERM") in ("truecolor", "24bit"):
        return 256
    return 16
