"""Where the traceback of a fault of the program goes, so that the screen can do with one sentence."""

from __future__ import annotations

import traceback
from datetime import datetime
from pathlib import Path

from fertui.tui.settings import state_folder


def log_fault(fault: BaseException) -> Path | None:
    """Write the traceback to a file of its own; returns its path, or None where nothing can be written."""
    path = state_folder() / f"fault-{datetime.now():%Y%m%d-%H%M%S-%f}.log"
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text("".join(traceback.format_exception(fault)), encoding="utf-8")
    except OSError:
        return None
    return path


def fault_sentence(what: str, fault: BaseException) -> str:
    """One sentence about a fault, with the file that knows more."""
    path = log_fault(fault)
    where = f" Details: {path}" if path else ""
    return f"fertui met a fault of its own in {what} ({type(fault).__name__}). The logbook is untouched.{where}"
