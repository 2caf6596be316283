"""What a command costs beside a bare start of Python with numpy, fresh processes measured in turns in one run."""

from __future__ import annotations

import resource
import statistics
import subprocess
import sys
from collections.abc import Callable, Sequence
from pathlib import Path

import pytest

pytestmark = pytest.mark.long

BARE = ("-c", "import numpy")
RUNS = 5
Ratio = Callable[[str, float, str], None]


def cpu_seconds(words: Sequence[str]) -> float:
    """Processor time of one child process: other work on the machine adds to wall time, not to this."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run([sys.executable, *words], check=True, capture_output=True)
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime


def against_bare(words: Sequence[str]) -> float:
    cpu_seconds(words)  # once, so that bytecode is there
    ours, bare = [], []
    for _ in range(RUNS):
        ours.append(cpu_seconds(words))
        bare.append(cpu_seconds(BARE))
    return statistics.median(ours) / statistics.median(bare)


def test_recording_a_reading(demo: Path, says_ratio: Ratio) -> None:
    words = ("-m", "fertui", "record", str(demo), "reading", "point=feed", "EC=2.6", "pH=5.5", "by=MK")
    found = against_bare(words)
    says_ratio("record a reading / Python with numpy", found, "no bar")
    assert found < 5.0


def test_the_last_known_numbers(demo: Path, says_ratio: Ratio) -> None:
    look = f"from fertui.workbench import open_site; open_site({str(demo)!r}).glance()"
    found = against_bare(("-c", look))
    says_ratio("last known numbers, for the first paint / Python with numpy", found, "no bar")
    assert found < 5.0


@pytest.mark.parametrize("loop", ["north bay", "lettuce"])
def test_today_from_a_cold_start(demo: Path, says_ratio: Ratio, loop: str) -> None:
    """Sixty days of log, 300 members, nothing kept from before."""
    found = against_bare(("-m", "fertui", "today", str(demo), "--loop", loop, "--json"))
    says_ratio(f"today, {loop}, 60 days of log, cold / Python with numpy", found, "asked: at most 5")
    assert found < 15.0


@pytest.mark.parametrize("loop", ["north bay", "lettuce"])
def test_what_a_plan_costs(demo_once: Path, says_ratio: Ratio, loop: str) -> None:
    from fertui.workbench import open_site
    from tests.conftest import DEMO_MORNING

    plan = open_site(demo_once).plan(loop, at=DEMO_MORNING)
    says_ratio(f"plan, {loop}: model runs", plan.model_runs, "at most 12")
    says_ratio(f"plan, {loop}: solver calls", plan.solver_calls, "at most 6")
    assert plan.model_runs <= 12
    assert plan.solver_calls <= 6
