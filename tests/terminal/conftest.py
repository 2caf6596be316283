"""A demo site of a fixed day, and a terminal on it with results made by hand (so that screens are the same every
day)."""

from __future__ import annotations

import shutil
import sys
from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from pathlib import Path

import pytest

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE))  # the driver and the hand-made workbench lie beside the tests

from pseudo_terminal import PseudoTerminal  # noqa: E402

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


@pytest.fixture
def open_terminal(tmp_path: Path) -> Iterator[Opened]:
    """Opens a site in a terminal of its own; every terminal is closed at the end of the test."""
    opened: list[PseudoTerminal] = []

    def start(
        site: Path, *, fixed: bool = False, size: tuple[int, int] = (80, 24), **environment: str
    ) -> PseudoTerminal:
        command = [sys.executable, str(HERE / "hand_made.py"), str(site), *([AT.isoformat()] if fixed else [])]
        own = {
            "HOME": str(tmp_path),
            "XDG_CONFIG_HOME": str(tmp_path / "config"),
            "XDG_STATE_HOME": str(tmp_path / "state"),
        }
        terminal = PseudoTerminal(command, size, {**own, **environment}, tmp_path)
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


@pytest.fixture(scope="module")
def shared_site(built: dict[str, Path], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A demo site for all tests of a file that leave it fit for the next one."""
    return shutil.copytree(built["fixed"], tmp_path_factory.mktemp("shared") / "nursery")


@pytest.fixture(scope="module")
def shared_terminal(shared_site: Path) -> Iterator[PseudoTerminal]:
    """One terminal for those tests: a start costs more than all they press."""
    home = shared_site.parent
    own = {"HOME": str(home), "XDG_CONFIG_HOME": str(home), "XDG_STATE_HOME": str(home)}
    with PseudoTerminal([sys.executable, str(HERE / "hand_made.py"), str(shared_site)], (80, 24), own, home) as shown:
        shown.until_text("more to look at")
        shown.settle()
        yield shown
