"""One function a use case; the only door for the command line and the terminal interface."""

from fertui.workbench.bench import Bench, open_site

__all__ = ["Bench", "open_site"]
