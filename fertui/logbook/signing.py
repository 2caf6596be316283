"""Who made an entry: the one rule for initials, whichever way they come in."""

from __future__ import annotations

import re

from fertui.logbook.errors import LogbookError

ALLOWED = "1 to 16 letters or digits without spaces, such as MK"
_INITIALS = re.compile(r"[^\W_][\w.-]{0,15}")


def initials(text: str) -> str:
    """Initials as they are written in the logbook; raises ``LogbookError`` for none and for what is none.

    Short, so that they fit every line and sheet; without spaces, so that a table keeps them in one column.

    >>> initials(" MK ")
    'MK'
    """
    text = text.strip()
    if not text:
        raise LogbookError("by is missing: who made this entry? Give by=INITIALS or set FERTUI_OPERATOR.")
    if not _INITIALS.fullmatch(text):
        raise LogbookError(f"by = {text!r}: initials are {ALLOWED}.")
    return text
