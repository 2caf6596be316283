"""What several rooms' tests share: the demo site at a fixed morning, and the measured houses where they are."""

from __future__ import annotations

import os
import shutil
from datetime import UTC, datetime
from pathlib import Path

import pytest
from hypothesis import settings

from fertui.workbench.demo import build_demo

settings.register_profile("steady", derandomize=True, deadline=None)
settings.register_profile("searching", deadline=None)
settings.load_profile(os.environ.get("HYPOTHESIS_PROFILE", "steady"))
# The suite says the same twice; ``HYPOTHESIS_PROFILE=searching`` looks for new examples. Slow machines are no failure.

DEMO_MORNING = datetime(2026, 6, 1, 6, 30, tzinfo=UTC)
"""The morning the demo of the tests ends on: 08:30 on its own clock."""

HOUSES_DOI = "doi:10.4121/uuid:88d22c60-21b3-4ea8-90db-20249a5be2a7"


@pytest.fixture(scope="session")
def demo_once(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The demo site, built once; do not write into it."""
    return build_demo(tmp_path_factory.mktemp("demo") / "site", now=DEMO_MORNING)


@pytest.fixture
def demo(demo_once: Path, tmp_path: Path) -> Path:
    """A copy of the demo site to write into."""
    return Path(shutil.copytree(demo_once, tmp_path / "site"))


@pytest.fixture(scope="session")
def house_folder() -> Path:
    """Folder with the measured houses; skips where it is absent."""
    named = os.environ.get("FERTUI_CASES")
    folder = Path(named) if named else Path(__file__).parent.parent.parent / "shared" / "cases"
    if not (folder / "rockwool_tomato_analyses.csv").is_file():
        pytest.skip(f"the measured houses are not here: fetch {HOUSES_DOI} and name their folder in FERTUI_CASES")
    return folder
