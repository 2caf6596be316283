"""What the forms of a loop offer to choose from, as its site describes it, and the fields every form ends with."""

from __future__ import annotations

from typing import TYPE_CHECKING

from fertui.tui.forms.spec import EVERY, Asked

if TYPE_CHECKING:
    from fertui.site.model import Loop, Site

NOTE = Asked("note", "note", words=True, entry=EVERY)
TIME = Asked("at", "when", entry=EVERY, words=True)
METHODS = ("", "pore", "extract_1_1.5", "paste", "pour_through")
"""How a sample was taken; '' where it need not be said."""


def points_of(loop: Loop) -> tuple[str, ...]:
    """Points of a loop that can be sampled."""
    from fertui.logbook.parse import POINTS_BY_LAYOUT

    return POINTS_BY_LAYOUT[loop.layout]


def usual_point(loop: Loop) -> str:
    """Where a loop is sampled first of all: the point it is steered by."""
    from fertui.workbench.glance import managed_point

    return managed_point(loop)


def tanks_of(site: Site, loop: Loop) -> tuple[str, ...]:
    """Stock tanks of a loop, of the site where the loop names none."""
    return loop.stock_tanks or tuple(tank.name for tank in site.stock_tanks)


def containers_of(site: Site, loop: Loop) -> tuple[str, ...]:
    """What can hold litres in a loop: its tank or drain store, then its stock tanks."""
    own = ("tank",) if loop.layout == "shared-tank" else ("drain_store",) if loop.layout == "drain-blend" else ()
    return (*own, *tanks_of(site, loop))


def acids_of(site: Site) -> tuple[str, ...]:
    """Supplies with a strength: acids and lyes."""
    return tuple(supply.name for supply in site.supplies if supply.strength_pct is not None)


def salts_of(site: Site) -> tuple[str, ...]:
    """Supplies that are weighed."""
    return tuple(supply.name for supply in site.supplies if supply.strength_pct is None)
