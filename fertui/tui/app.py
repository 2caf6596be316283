"""Opens the terminal interface on a site folder."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

from fertui.refusals import Refusal
from fertui.tui.frame import FertuiApp
from fertui.tui.settings import read_settings
from fertui.tui.terminal import read_terminal

if TYPE_CHECKING:
    from fertui.workbench import Bench

THREAD_TURN = 0.0005
"""Seconds after which a running model lets a waiting key press have its turn (Python's own choice is 0.005)."""


def run(site_folder: Path, at: datetime | None = None) -> int:
    """Show the site until the operator leaves; returns the exit code."""

    def open_bench() -> Bench:
        from fertui.workbench import open_site

        return open_site(site_folder)

    if not (site_folder / "site.toml").is_file():
        open_bench()  # says what is wrong
    return run_on(open_bench, site_folder, at)


def run_on(open_bench: Callable[[], Bench], folder: Path, at: datetime | None = None) -> int:
    """The same on any workbench."""
    refuse_bare_terminal()
    if not os.environ.get("NO_COLOR"):
        os.environ.pop("NO_COLOR", None)  # set but empty asks for nothing
    sys.setswitchinterval(THREAD_TURN)
    settings = read_settings(known_ids)
    terminal = read_terminal(ascii_wanted=settings.ascii)
    app = FertuiApp(open_bench, folder, at, settings, terminal, os.environ.get("FERTUI_OPERATOR", ""))
    app.run(mouse=settings.mouse)
    if app.fault is not None:
        raise app.fault
    return app.return_code or 0


def refuse_bare_terminal() -> None:
    """A terminal that cannot move its cursor is told of the plain command."""
    if os.environ.get("TERM", "dumb") in ("dumb", ""):
        raise Refusal(
            "This terminal (TERM=dumb) cannot show screens. 'fertui today SITE' prints the same as plain text."
        )
    if not (sys.stdin.isatty() and sys.stderr.isatty()):
        raise Refusal("There is no terminal here. 'fertui today SITE' prints the same as plain text.")


def known_ids() -> set[str]:
    """Ids of all bindings, by which keys can be changed."""
    from fertui.tui.actions import all_bindings

    return {binding.id for binding in all_bindings() if binding.id}
