"""What every number of the catalogue carries: where it comes from and how far that has been checked."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from functools import cache
from itertools import pairwise
from pathlib import Path
from typing import Any, NamedTuple

from fertui.refusals import Refusal

STATUSES = ("seen", "second-hand", "computed", "common practice", "derived", "from memory")
"""How a number is known, best first: read in the source itself; read in a text that cites it; arithmetic on the
numbers given; said in the trade without a source; our own inference; remembered and not yet verified."""

UNVERIFIED = ("derived", "from memory")
NO_SOURCE = "no source"


class CatalogueError(Refusal):
    """A salt, acid, crop or label analysis that the catalogue cannot accept; the message says why and what to do."""


class Provenance(NamedTuple):
    """Where a number comes from (``text``) and how it is known (one of ``STATUSES``)."""

    text: str
    status: str

    @property
    def shown(self) -> str:
        """The source as a grower sees it; what nobody has verified is called an unverified preset.

        >>> Provenance("Sonneveld & Voogt 2009", "from memory").shown
        'unverified preset (from memory: Sonneveld & Voogt 2009)'
        >>> Provenance("Dutch booklet 2016", "second-hand").shown
        'Dutch booklet 2016 (second-hand)'
        """
        if self.status in UNVERIFIED:
            return f"unverified preset ({self.status}: {self.text})"
        if self.text == NO_SOURCE:
            return f"{self.status}, {NO_SOURCE}"
        return self.text if self.status == "seen" else f"{self.text} ({self.status})"


class Range(NamedTuple):
    """A band or limit; a side that is None is open."""

    low: float | None
    high: float | None
    source: Provenance


class Figure(NamedTuple):
    """One number with its source."""

    value: float
    source: Provenance


class Recipe(NamedTuple):
    """Ions [mmol/L], micronutrients [umol/L], EC [mS/cm at 25 C] and pH of a published solution or target.

    ``unverified`` names the entries whose number does not come from ``source`` but is our own guess.
    """

    source: Provenance
    ions: Mapping[str, float] = {}
    micronutrients: Mapping[str, float] = {}
    ec: float | None = None
    ph: float | None = None
    unverified: tuple[str, ...] = ()

    @property
    def shown_source(self) -> str:
        """Source as a grower sees it, naming the numbers in it that are unverified presets."""
        if not self.unverified:
            return self.source.shown
        return f"{self.source.shown}; unverified preset: {', '.join(self.unverified)}"


def interpolated(points: Sequence[tuple[float, float]], at: float) -> float:
    """Linear between tabulated points (rising x, at least two), flat beyond them.

    >>> interpolated(((0.0, 10.0), (10.0, 20.0)), 5.0)
    15.0
    """
    at = min(max(at, points[0][0]), points[-1][0])
    around = next(pair for pair in pairwise(points) if at <= pair[1][0])
    (left, low), (right, high) = around
    return low + (at - left) / (right - left) * (high - low)


def nearest(word: str, known: Mapping[str, str], most: int = 4) -> tuple[str, ...]:
    """Names, each once, whose spellings begin with a word, else those much like it; ``known``: spelling -> name.

    >>> nearest("peat", {"peat moss": "peat", "peat": "peat", "perlite": "perlite"})
    ('peat',)
    """
    import difflib

    begin = [spelling for spelling in known if len(word) > 1 and spelling.startswith(word)]
    near = begin or difflib.get_close_matches(word[:60], known, n=3)
    return tuple(dict.fromkeys(known[spelling] for spelling in near))[:most]


@cache
def table(name: str) -> dict[str, Any]:
    """One TOML file of this room, read once; not to be changed."""
    return tomllib.loads(Path(__file__).with_name(f"{name}.toml").read_text(encoding="utf-8"))
