"""Who made an entry: the one rule for initials and names, whichever way they come in."""

from __future__ import annotations

import re

from fertui.logbook.errors import LogbookError

ALLOWED = "1 to 40 letters, digits, spaces, . ' or -, such as MK"
_INITIALS = re.compile(r"[^\W_][\w .'-]{0,39}")


def initials(text: str) -> str:
    """Initials or a short name as written in the logbook; raises ``LogbookError`` for none and for what is none.

    >>> initials(" MK ")
    'MK'
    """
    text = text.strip()
    if not text:
        raise LogbookError("by is missing: who made this entry? Give by=INITIALS or set FERTUI_OPERATOR.")
    if not _INITIALS.fullmatch(text):
        raise LogbookError(f"by = {text!r}: initials or a name are {ALLOWED}.")
    return text
