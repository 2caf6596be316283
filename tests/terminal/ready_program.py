"""A program that is loaded already: starting the terminal interface from it takes a fork instead of all the imports.

Run as a process of its own it takes one JSON object a line and answers each with a number: ``{"start": ...}`` with the
id of the process started, ``{"ended": id}`` with its exit code, or null while it runs.
"""

from __future__ import annotations

import gc
import json
import os
import subprocess
import sys
import traceback
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from pseudo_terminal import Start, enter_terminal


class Started:
    """One of the programs."""

    def __init__(self, ready: ReadyProgram, pid: int) -> None:
        self._ready, self.pid = ready, pid

    def ended(self) -> int | None:
        """Its exit code, None while it runs."""
        code = self._ready.asked({"ended": self.pid})
        return None if code is None else int(code)


class ReadyProgram:
    """The other end: starts programs in terminals and tells how they ended."""

    def __init__(self) -> None:
        self._process = subprocess.Popen(
            [sys.executable, __file__], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
        )

    def on(self, site: Path, at: str = "") -> Start:
        """What starts the interface on a site with results made by hand, as of a fixed moment."""

        def start(terminal: str, environment: Mapping[str, str], folder: Path) -> Started:
            wanted = {"terminal": terminal, "site": str(site), "at": at, "environment": environment}
            return Started(self, int(self.asked({"start": {**wanted, "folder": str(folder)}})))

        return start

    def close(self) -> None:
        """End the loaded program; those it started go on."""
        self._process.communicate()

    def asked(self, request: Mapping[str, Any]) -> Any:
        """The answer to a request."""
        stdin, stdout = self._process.stdin, self._process.stdout
        assert stdin is not None
        assert stdout is not None
        stdin.write(json.dumps(request) + "\n")
        stdin.flush()
        return json.loads(stdout.readline())


def serve() -> None:
    """Answer requests until there are no more."""
    for request in sys.stdin:
        wanted = json.loads(request)
        answer = start(**wanted["start"]) if "start" in wanted else ended(wanted["ended"])
        print(json.dumps(answer), flush=True)


def start(terminal: str, **wanted: Any) -> int:
    """Start a program in a terminal; returns its process."""
    line = os.open(terminal, os.O_RDWR | os.O_NOCTTY)
    pid = os.fork()
    if pid == 0:
        become(line, **wanted)
    os.close(line)
    return pid


def ended(pid: int) -> int | None:
    """The exit code of a process that has ended."""
    found, status = os.waitpid(pid, os.WNOHANG)
    return os.waitstatus_to_exitcode(status) if found else None


def become(line: int, site: str, at: str, environment: Mapping[str, str], folder: str) -> None:
    """Be the program in a terminal, as if just started there; does not return."""
    code = 70
    try:
        enter_terminal(line)
        os.chdir(folder)
        os.environ.clear()
        os.environ.update(environment)
        gc.freeze()
        code = open_hand_made(Path(site), at)
    except BaseException:  # the end of a process of its own: whatever it was goes to its screen
        traceback.print_exc()
    finally:
        sys.stdout.flush()
        os._exit(code)


if __name__ == "__main__":
    import importlib
    import pkgutil

    from hand_made import open_hand_made

    import fertui.tui

    for module in pkgutil.walk_packages(fertui.tui.__path__, "fertui.tui."):
        importlib.import_module(module.name)
    import fertui.workbench

    for module in pkgutil.iter_modules(fertui.workbench.__path__, "fertui.workbench."):
        importlib.import_module(module.name)
    serve()
