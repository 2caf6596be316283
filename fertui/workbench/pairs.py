"""Whether what is said to be in a stock tank can stand in one solution: asked when a batch is logged."""

from __future__ import annotations

from collections.abc import Iterator

from fertui.logbook.entries import Entry
from fertui.logbook.questions import Question
from fertui.logbook.store import Logbook
from fertui.site.model import Site, StockTank


def pairs(entry: Entry, book: Logbook, site: Site) -> Iterator[Question]:
    """A question for every two things of a batch, old solution left in its tank included, that must not meet."""
    tank = _held(entry, book, site)
    if tank is None:
        return
    from fertui.catalogue.figures import CatalogueError
    from fertui.planning.shelf import shelf
    from fertui.planning.stock import standing_conflicts

    try:
        found = standing_conflicts([tank], shelf(site.supplies))
    except CatalogueError:  # a salt of which nobody can say what is in it
        return
    for each in found:
        one, other = each.pair
        text = f"{one} and {other} in one stock tank: {each.why}. Were both weighed into {tank.name!r}?"
        written = entry.value(other)
        yield Question("pair", text, other if written else "", written.text if written else "")


def _held(entry: Entry, book: Logbook, site: Site) -> StockTank | None:
    """The stock tank of a batch with what is then in it; None for other entries, or where nothing is told of it."""
    litres, name = entry.number_of("litres"), entry.text_of("tank")
    if entry.kind != "batch" or not litres:
        return None
    from fertui.logbook.mixes import mixes

    before = book.entries(entry.loop or None, ("batch",), at=entry.at)
    mix = mixes([*(each for each in before if each.number != entry.supersedes), entry], name)[-1]
    tank = next((each for each in site.stock_tanks if each.name == name), StockTank(name, litres))
    return tank._replace(litres=litres, salts_kg={salt: each * litres for salt, each in mix.kg_per_l.items()})
