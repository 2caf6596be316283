"""Styles of the terminal as values, and the shortest sequence from one to another.

The toolkit wraps each piece of text in a full style and a reset. Over a thin line that is more bytes than the text.
"""

from __future__ import annotations

from functools import lru_cache
from typing import NamedTuple

_OFF = {"1": "22", "2": "22", "3": "23", "4": "24", "5": "25", "7": "27", "8": "28", "9": "29"}


class Style(NamedTuple):
    """What the terminal was told: attributes that are on, and colours as written in the sequence ('' for its own)."""

    on: frozenset[str] = frozenset()
    ink: str = ""
    paper: str = ""


PLAIN = Style()


@lru_cache(1024)
def styled(style: Style, codes: str) -> Style:
    """The style after a sequence with these codes.

    >>> styled(PLAIN, "1;38;5;9").ink
    '38;5;9'
    """
    words = codes.split(";")
    while words:
        word = words.pop(0)
        if word in ("", "0"):
            style = PLAIN
        elif word in ("38", "48"):
            length = 2 if words[:1] == ["5"] else 4
            colour = ";".join((word, *words[:length]))
            del words[:length]
            style = style._replace(ink=colour) if word == "38" else style._replace(paper=colour)
        elif word in _OFF.values():
            style = style._replace(on=frozenset(code for code in style.on if _OFF[code] != word))
        elif word in _OFF:
            style = style._replace(on=style.on | {word})
        elif word in ("39", "49"):
            style = style._replace(ink="") if word == "39" else style._replace(paper="")
        elif word[0] in "39" and word != "3":
            style = style._replace(ink=word)
        elif word[0] in "41":
            style = style._replace(paper=word)
    return style


@lru_cache(1024)
def change(has: Style, wants: Style) -> str:
    """The shortest sequence that takes the terminal from one style to the other.

    >>> change(PLAIN, Style(ink="38;5;9"))
    '\\x1b[38;5;9m'
    """
    if has == wants:
        return ""
    if wants == PLAIN:
        return "\x1b[m"
    codes = []
    lost = has.on - wants.on
    codes += sorted({_OFF[code] for code in lost})
    switched_off_together = {"1", "2"} if lost & {"1", "2"} else set()
    codes += sorted(wants.on - (has.on - switched_off_together))
    if has.ink != wants.ink:
        codes.append(wants.ink or "39")
    if has.paper != wants.paper:
        codes.append(wants.paper or "49")
    return f"\x1b[{';'.join(codes)}m"
