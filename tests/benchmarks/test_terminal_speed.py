"""First paint of the terminal interface as a ratio to a bare app of the same toolkit in one run.

The bar is the project's own: at most 1.6 times the bare app's.
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "terminal"))  # the driver of terminals lies beside those tests

from pseudo_terminal import PseudoTerminal

from fertui.workbench.demo import build_demo

pytestmark = pytest.mark.long

Ratio = Callable[[str, float, str], None]
STARTS = 7
SLOWER_TO_PAINT = 1.6
BARE = [sys.executable, str(Path(__file__).with_name("bare_app.py"))]


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return build_demo(tmp_path_factory.mktemp("speed") / "nursery")


def opened(command: list[str], home: Path) -> PseudoTerminal:
    own = {"HOME": str(home), "XDG_CONFIG_HOME": str(home), "XDG_STATE_HOME": str(home)}
    return PseudoTerminal(command, (80, 24), own, home)


def fertui(site: Path) -> list[str]:
    return [sys.executable, "-m", "fertui", str(site)]


def first_paint(command: list[str], shows: str, home: Path) -> float:
    """Seconds from the start of the process until a text is on the screen."""
    begin = time.perf_counter()
    with opened(command, home) as terminal:
        while shows not in terminal.text:
            assert time.perf_counter() - begin < 30.0, terminal.text
            terminal.read(0.01)
        return time.perf_counter() - begin


def test_the_first_paint_takes_little_longer_than_a_bare_apps(site: Path, says_ratio: Ratio) -> None:
    ours, bare = [], []
    for _ in range(STARTS):
        bare.append(first_paint(BARE, "row 20 of the bare app", site.parent))
        ours.append(first_paint(fertui(site), "9Site", site.parent))
    found = statistics.median(ours) / statistics.median(bare)
    says_ratio("first paint / bare app", found, f"at most {SLOWER_TO_PAINT}")
    assert found <= SLOWER_TO_PAINT
