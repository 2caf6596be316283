"""The ``fertui`` command: joins the two front ends, neither of which knows the other."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path

from fertui.cli.main import run_command


def main() -> int:
    """Run the command line; returns the exit code."""
    return run_command(open_terminal=_open_terminal)


def _open_terminal(folder: Path, at: datetime | None) -> int:
    from fertui.tui.app import run

    return run(folder, at=at)


if __name__ == "__main__":
    raise SystemExit(main())
