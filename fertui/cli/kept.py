"""Answers to the questions of a new site, kept until it is made: a lost connection loses none of them."""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path

from fertui.cli.state import state_folder

FILE = "new-sites.json"


class KeptAnswers:
    """Answers, option -> text, for the site that a folder is to be. Where they cannot be kept nothing else fails."""

    def __init__(self, folder: Path) -> None:
        self._site = str(folder.absolute())

    def find(self) -> dict[str, str]:
        """The answers kept, {} where there are none that can be read."""
        found = _all().get(self._site)
        return {str(option): str(text) for option, text in found.items()} if isinstance(found, dict) else {}

    def keep(self, answers: Mapping[str, str]) -> None:
        """Keep answers in place of those before."""
        _write({**_all(), self._site: dict(answers)})

    def drop(self) -> None:
        """Forget the answers: the site is made."""
        kept = _all()
        if kept.pop(self._site, None) is not None:
            _write(kept)


def _all() -> dict[str, object]:
    try:
        found = json.loads((state_folder() / FILE).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return found if isinstance(found, dict) else {}


def _write(kept: Mapping[str, object]) -> None:
    try:
        path = state_folder() / FILE
        fresh = path.with_suffix(".new")
        fresh.write_text(json.dumps(kept, ensure_ascii=False), encoding="utf-8")
        fresh.replace(path)
    except OSError:
        return
