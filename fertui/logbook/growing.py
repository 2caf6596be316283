"""Whether a crop stands in a loop, from what was logged of it."""

from __future__ import annotations

from fertui.logbook.entries import Entry

NO_CROP = "no crop"
"""In place of the crop's name while none stands."""
_BEGINS, _ENDS = ("planted", "replanted"), "removed"


def stands_after(entry: Entry, before: bool = True) -> bool:
    """Whether a crop stands once an entry of the kind crop was made, given whether one stood ``before``.

    >>> from datetime import datetime
    >>> from fertui.logbook.entries import Value
    >>> at = datetime(2026, 3, 1)
    >>> stands_after(Entry("crop", "bay", at, at, "MK", (Value("event", "removed"),)))
    False
    """
    event = entry.text_of("event")
    return event != _ENDS and (before or event in _BEGINS)
