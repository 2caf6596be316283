"""Where a sample is taken, in the words of the trade: what is shown for each point, and what people may call it.

Files, JSON and ``point=`` keep the names of ``site.model.POINTS``; ``feed`` is shown as the drip, where it is caught.
"""

from __future__ import annotations

from collections.abc import Mapping

POINT_NAMES: Mapping[str, str] = {
    "source": "source water", "feed": "drip", "tank": "tank", "root_zone": "root zone", "drain": "drain",
    "drain_store": "drain store",
}  # fmt: skip
"""The word shown for every point."""

_CALLED: Mapping[str, str] = {
    "dripper": "feed", "drip water": "feed", "inlet": "feed", "slab": "root_zone", "substrate": "root_zone",
    "gutter": "drain", "drainage": "drain", "drain water": "drain",
    **{point.replace("_", " "): point for point in POINT_NAMES}, **{name: point for point, name in POINT_NAMES.items()},
}  # fmt: skip


def point_name(point: str, layout: str = "") -> str:
    """A point in words; the feed of a tank without drippers is an inlet.

    >>> point_name("feed"), point_name("feed", "shared-tank"), point_name("root_zone")
    ('drip', 'inlet', 'root zone')
    """
    return "inlet" if point == "feed" and layout == "shared-tank" else POINT_NAMES.get(point, point)


def at_point(point: str, layout: str = "") -> str:
    """The same with its preposition.

    >>> at_point("feed"), at_point("drain_store")
    ('at the drip', 'in the drain store')
    """
    return f"{'at' if point == 'feed' else 'in'} the {point_name(point, layout)}"


def point_called(words: str) -> str:
    """The point that people call so (common practice, no source), '' where none is known by that name.

    >>> point_called("Drip"), point_called("root-zone"), point_called("elsewhere")
    ('feed', 'root_zone', '')
    """
    return _CALLED.get(words.lower().replace("_", " ").replace("-", " ").strip(), "")
