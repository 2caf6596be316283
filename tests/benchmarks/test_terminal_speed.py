"""First paint and key latency of the terminal interface, each as a ratio to a bare app of the same toolkit in one run.

The bars are the project's own: the first paint at most 1.6 times the bare app's; the 90th percentile from a key to the
first byte, while the model runs in its worker, at most twice the bare app's.
"""

from __future__ import annotations

import itertools
import select
import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "terminal"))  # the driver of terminals lies beside those tests

from pseudo_terminal import KEYS, Command, PseudoTerminal

from fertui.workbench.demo import build_demo

pytestmark = pytest.mark.long

Ratio = Callable[[str, float, str], None]
STARTS, PRESSES = 7, 60
SLOWER_TO_PAINT, SLOWER_TO_ANSWER = 1.6, 2.0
BARE = [sys.executable, str(Path(__file__).with_name("bare_app.py"))]
MODEL_AT_WORK = "orking out"


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return build_demo(tmp_path_factory.mktemp("speed") / "nursery")


def opened(command: list[str], home: Path) -> PseudoTerminal:
    own = {"HOME": str(home), "XDG_CONFIG_HOME": str(home), "XDG_STATE_HOME": str(home)}
    return PseudoTerminal(Command(command), (80, 24), own, home)


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


def drain(terminal: PseudoTerminal) -> None:
    """Read until nothing comes for a while."""
    while terminal.read(0.05):
        pass


def answer_time(terminal: PseudoTerminal, key: str) -> float:
    """Seconds from a key to the first byte that comes back; the model may be at work all the while."""
    drain(terminal)
    begin = time.perf_counter()
    terminal.type(KEYS[key].encode())
    assert select.select([terminal.line], [], [], 5.0)[0], terminal.text
    return time.perf_counter() - begin


def p90(seconds: list[float]) -> float:
    return statistics.quantiles(seconds, n=10)[-1]


def test_the_first_paint_takes_little_longer_than_a_bare_apps(site: Path, says_ratio: Ratio) -> None:
    ours, bare = [], []
    for _ in range(STARTS):
        bare.append(first_paint(BARE, "row 20 of the bare app", site.parent))
        ours.append(first_paint(fertui(site), "9Site", site.parent))
    found = statistics.median(ours) / statistics.median(bare)
    says_ratio("first paint / bare app", found, f"at most {SLOWER_TO_PAINT}")
    assert found <= SLOWER_TO_PAINT


def test_a_key_is_answered_while_the_model_runs(site: Path, says_ratio: Ratio) -> None:
    with opened(BARE, site.parent) as terminal:
        terminal.until_text("row 20 of the bare app")
        bare = [answer_time(terminal, ("down", "up")[n % 2]) for n in range(PRESSES)]
    ours: list[float] = []
    with opened(fertui(site), site.parent) as terminal:
        terminal.until_text("K share")
        for key in itertools.cycle(("down", "up")):
            if MODEL_AT_WORK not in terminal.text:
                terminal.type(KEYS["f5"].encode())
                terminal.until_text(MODEL_AT_WORK)
            taken = answer_time(terminal, key)
            drain(terminal)
            if MODEL_AT_WORK in terminal.text:  # it was at work before the key and still is
                ours.append(taken)
            if len(ours) == PRESSES:
                break
    found = p90(ours) / p90(bare)
    says_ratio("key to first byte, p90, model at work / bare app", found, f"at most {SLOWER_TO_ANSWER}")
    assert found <= SLOWER_TO_ANSWER
