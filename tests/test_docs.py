"""The docs say what the program says: pages made from it have not drifted, and links lead somewhere."""

from __future__ import annotations

import importlib.util
import re
import shlex
import sys
from pathlib import Path
from types import ModuleType

import pytest

ROOT = Path(__file__).parent.parent


sys.path.insert(0, str(ROOT / "docs"))  # the pictures of the guide lie beside the maker


def maker() -> ModuleType:
    spec = importlib.util.spec_from_file_location("docs_make", ROOT / "docs" / "make.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def words_of(page: str) -> str:
    """A page without digits, gauges and spacing: rounding may differ between numerics libraries, words may not."""
    return re.sub(r"\s+", " ", re.sub(r"[\d▁-█░─●·◀▶]", "", page))


@pytest.mark.parametrize("page", sorted(maker().PAGES), ids=lambda path: path.name)
def test_a_page_made_from_the_program_has_not_drifted(page: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    assert words_of(page.read_text(encoding="utf-8")) == words_of(maker().PAGES[page]()), "run python docs/make.py"


@pytest.mark.parametrize("page", sorted(maker().DRAWN), ids=lambda path: path.name)
def test_a_screen_shown_in_the_docs_is_the_program_s(page: Path) -> None:
    assert words_of(page.read_text(encoding="utf-8")) == words_of(maker().DRAWN[page]()), "run python docs/make.py"


GUIDE = (ROOT / "docs" / "guide.md").read_text(encoding="utf-8")


def test_every_picture_of_the_guide_is_made_and_every_one_made_is_shown() -> None:
    import pictures

    shown = re.findall(r"<!-- made: (.+?) -->", GUIDE)
    firsts = {"new nft", "new pepper", "first day", "first analysis", "first plan"}
    assert sorted(shown) == sorted({*pictures.SCREENS, *pictures.PRINTED, *firsts})


def typed_commands() -> list[str]:
    """Commands written in the guide's text and blocks, pictures left out: those run already."""
    page = re.sub(r"<!-- made: .*?<!-- end -->", "", GUIDE, flags=re.DOTALL)
    return sorted(set(re.findall(r"^fertui [^#\n]+", page, re.MULTILINE)) | set(re.findall(r"`(fertui [^`]+)`", page)))


@pytest.mark.parametrize("command", typed_commands())
def test_a_command_written_in_the_guide_is_one(command: str) -> None:
    from fertui.cli.parser import COMMANDS, build

    words = shlex.split(command)[1:]
    assert words[0] in COMMANDS or len(words) == 1
    if len(words) > 1:
        build().parse_args([*words, *(["SITE"] if len(words) == 1 else [])])


def test_a_key_written_in_the_guide_s_last_table_opens_what_stands_beside_it() -> None:
    from fertui.tui.keys import GLOBAL_KEYS

    bound = {binding.key: binding.description for binding in GLOBAL_KEYS}
    rows = re.findall(r"^\| `(\d)` \| (\w+)", GUIDE, re.MULTILINE)
    assert len(rows) == 9
    assert all(bound[key] == view for key, view in rows)


@pytest.mark.parametrize("page", sorted(ROOT.glob("*.md")) + sorted((ROOT / "docs").glob("*.md")), ids=lambda p: p.name)
def test_links_between_pages_lead_somewhere(page: Path) -> None:
    for target in re.findall(r"\]\(([^)#:]+)(?:#[^)]*)?\)", page.read_text(encoding="utf-8")):
        assert (page.parent / target).exists(), f"{page.name} links to {target}"
