"""The docs say what the program says: pages made from it have not drifted, and links lead somewhere."""

from __future__ import annotations

import importlib.util
import re
from pathlib import Path
from types import ModuleType

import pytest

ROOT = Path(__file__).parent.parent


def maker() -> ModuleType:
    spec = importlib.util.spec_from_file_location("docs_make", ROOT / "docs" / "make.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def words_of(page: str) -> str:
    """A page without its digits and spacing: rounding may differ between numerics libraries, words may not."""
    return re.sub(r"\s+", " ", re.sub(r"\d", "", page))


@pytest.mark.parametrize("page", sorted(maker().PAGES), ids=lambda path: path.name)
def test_a_page_made_from_the_program_has_not_drifted(page: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    assert words_of(page.read_text(encoding="utf-8")) == words_of(maker().PAGES[page]()), "run python docs/make.py"


@pytest.mark.parametrize("page", sorted(ROOT.glob("*.md")) + sorted((ROOT / "docs").glob("*.md")), ids=lambda p: p.name)
def test_links_between_pages_lead_somewhere(page: Path) -> None:
    for target in re.findall(r"\]\(([^)#:]+)(?:#[^)]*)?\)", page.read_text(encoding="utf-8")):
        assert (page.parent / target).exists(), f"{page.name} links to {target}"
