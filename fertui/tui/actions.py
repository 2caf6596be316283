"""Every action of the program, by key: for the list, for the help, and for the settings file."""

from __future__ import annotations

from collections.abc import Iterator

from textual.binding import Binding

from fertui.tui.keys import GLOBAL_KEYS, VIEW_NAMES
from fertui.tui.view import SCROLLING


def all_bindings() -> Iterator[Binding]:
    """Bindings of the frame, of scrolling and of every view, each once."""
    from fertui.tui.views import view_numbered

    seen: set[str | None] = set()
    for group in (GLOBAL_KEYS, SCROLLING, *(view_numbered(n).BINDINGS for n in range(1, len(VIEW_NAMES) + 1))):
        for binding in group:
            if isinstance(binding, Binding) and binding.id not in seen:
                seen.add(binding.id)
                yield binding
