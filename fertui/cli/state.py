"""Where the command line keeps what belongs to no site."""

from __future__ import annotations

import os
from pathlib import Path


def state_folder() -> Path:
    """The folder of this user for it; made where it is absent."""
    folder = Path(os.environ.get("XDG_STATE_HOME") or Path.home() / ".local" / "state") / "fertui"
    folder.mkdir(parents=True, exist_ok=True)
    return folder
