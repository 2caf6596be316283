"""Half-filled forms, kept in one file of the terminal interface beside the logbook, never in it.

A site is worked from one shared login: whoever opens the form next is offered what is there, with author and time.
"""

from __future__ import annotations

import json
import os
from collections.abc import Mapping
from datetime import datetime
from pathlib import Path
from typing import NamedTuple

FILE = "drafts.json"


class Draft(NamedTuple):
    """The texts of a half-filled form, who typed them and when; ``by`` may be '' where nobody has said.

    ``unit``: what its bare numbers for ions mean; '' where it was not kept.
    """

    by: str
    at: datetime
    texts: tuple[str, ...]
    unit: str = ""


class Drafts:
    """Drafts of a site by kind and loop. A folder that cannot be written keeps none, and nothing else fails for it."""

    def __init__(self, folder: Path) -> None:
        self._path = folder / FILE

    def find(self, kind: str, loop: str) -> Draft | None:
        """The draft of a form, None where there is none that can be read."""
        kept = self._all().get(_key(kind, loop))
        if not isinstance(kept, Mapping):
            return None
        try:
            texts = tuple(str(text) for text in kept["texts"])
            return Draft(str(kept["by"]), datetime.fromisoformat(str(kept["at"])), texts, str(kept.get("unit", "")))
        except (KeyError, TypeError, ValueError):
            return None

    def keep(self, kind: str, loop: str, draft: Draft) -> bool:
        """Keep a draft in place of the one before; False where that cannot be done."""
        kept = {"by": draft.by, "at": draft.at.isoformat(), "texts": list(draft.texts), "unit": draft.unit}
        return self._write({**self._all(), _key(kind, loop): kept})

    def drop(self, kind: str, loop: str) -> None:
        """Forget a draft: the form was saved."""
        drafts = self._all()
        if drafts.pop(_key(kind, loop), None) is not None:
            self._write(drafts)

    def _all(self) -> dict[str, object]:
        try:
            found = json.loads(self._path.read_text(encoding="utf-8"))
        except (OSError, ValueError):
            return {}
        return found if isinstance(found, dict) else {}

    def _write(self, drafts: Mapping[str, object]) -> bool:
        fresh = self._path.with_suffix(f".{os.getpid()}")
        try:
            if not drafts:
                self._path.unlink(missing_ok=True)
                return True
            descriptor = os.open(fresh, os.O_WRONLY | os.O_CREAT | os.O_TRUNC, 0o660)
            with open(descriptor, "w", encoding="utf-8") as file:
                json.dump(drafts, file, ensure_ascii=False)
            fresh.replace(self._path)
        except OSError:
            return False
        return True


def _key(kind: str, loop: str) -> str:
    return f"{kind} {loop}"
