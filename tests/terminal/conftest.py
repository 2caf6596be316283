"""A demo site of a fixed day, and a terminal on it with results made by hand (so that screens are the same every
day)."""

from __future__ import annotations

import re
import shutil
import sys
from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from pathlib import Path

import pytest

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE))  # the driver and the hand-made workbench lie beside the tests

from pseudo_terminal import Command, PseudoTerminal  # noqa: E402
from ready_program import ReadyProgram  # noqa: E402

AT = datetime(2026, 6, 1, 7, 0, tzinfo=UTC)
"""The morning the demo site of the tests ends on."""

Opened = Callable[..., PseudoTerminal]


@pytest.fixture(scope="session")
def built(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """Two demo sites: one that ends on the morning of ``AT``, one on the last morning there was."""
    from fertui.workbench.demo import build_demo

    folder = tmp_path_factory.mktemp("built")
    return {"fixed": build_demo(folder / "fixed", AT), "today": build_demo(folder / "today")}


@pytest.fixture
def site(built: dict[str, Path], tmp_path: Path) -> Path:
    """A demo site that ends on the morning of ``AT``."""
    return shutil.copytree(built["fixed"], tmp_path / "nursery")


@pytest.fixture
def todays_site(built: dict[str, Path], tmp_path: Path) -> Path:
    """A demo site that ends on the last morning there was: for what depends on entries being of now."""
    return shutil.copytree(built["today"], tmp_path / "nursery")


@pytest.fixture(scope="session")
def ready() -> Iterator[ReadyProgram]:
    """The program loaded once for all tests."""
    program = ReadyProgram()
    yield program
    program.close()


def own_folders(home: Path) -> dict[str, str]:
    """An environment in which the program keeps its settings in a folder of the test."""
    return {"HOME": str(home), "XDG_CONFIG_HOME": str(home / "config"), "XDG_STATE_HOME": str(home / "state")}


def frame_stands(terminal: PseudoTerminal, site_name: str) -> bool:
    """Whether header with place and clock, view names and the line of keys are where they belong."""
    rows = terminal.screen.display
    head = re.match(r" " + re.escape(site_name) + r".* \d\d:\d\d( +[\w.-]+)? *$", rows[0])
    return bool(head and re.match(r" ?1 ?Today", rows[1]) and rows[-1].strip())


@pytest.fixture
def open_terminal(ready: ReadyProgram, tmp_path: Path) -> Iterator[Opened]:
    """Opens a site in a terminal of its own; every terminal is closed at the end of the test.

    ``from_nothing``: by the command line, as a person does, not from the program that is loaded already.
    """
    opened: list[PseudoTerminal] = []

    def start(
        site: Path,
        *,
        fixed: bool = False,
        from_nothing: bool = False,
        size: tuple[int, int] = (80, 24),
        **environment: str,
    ) -> PseudoTerminal:
        at = AT.isoformat() if fixed else ""
        starting = Command([sys.executable, str(HERE / "hand_made.py"), str(site), at])
        terminal = PseudoTerminal(
            starting if from_nothing else ready.on(site, at), size, {**own_folders(tmp_path), **environment}, tmp_path
        )
        opened.append(terminal)
        return terminal

    yield start
    for terminal in opened:
        terminal.__exit__()


@pytest.fixture
def terminal(site: Path, open_terminal: Opened) -> PseudoTerminal:
    """The site open at Today with all its numbers."""
    shown = open_terminal(site)
    shown.until_text("more to look at")
    shown.settle()
    return shown


@pytest.fixture(scope="session")
def copied(built: dict[str, Path], tmp_path_factory: pytest.TempPathFactory) -> Callable[[], Path]:
    """Makes demo sites that end on the morning of ``AT``, each alone in a folder."""
    return lambda: shutil.copytree(built["fixed"], tmp_path_factory.mktemp("shared") / "nursery")


@pytest.fixture(scope="module")
def shared_site(copied: Callable[[], Path]) -> Path:
    """A demo site for all tests of a file that leave it fit for the next one."""
    return copied()


@pytest.fixture(scope="module")
def shared_terminal(ready: ReadyProgram, shared_site: Path) -> Iterator[PseudoTerminal]:
    """One terminal for those tests: a start costs more than all they press."""
    home = shared_site.parent
    with PseudoTerminal(ready.on(shared_site), (80, 24), own_folders(home), home) as shown:
        shown.until_text("more to look at")
        shown.settle()
        yield shown
