"""The nine views, one a file; each is loaded when it is first opened."""

from __future__ import annotations

from importlib import import_module

from fertui.tui.keys import VIEW_NAMES
from fertui.tui.view import View


def view_numbered(number: int) -> type[View]:
    """The class of a view by its number on the screen."""
    name = VIEW_NAMES[number - 1]
    return getattr(import_module(f"fertui.tui.views.{name.lower()}"), f"{name}View")
