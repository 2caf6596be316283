"""What is in force for a loop and where it comes from: bands and limits at each point, waters as last analysed."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from fertui.chemistry.names import MICRONUTRIENTS
from fertui.site.model import Loop, Site, Sourced
from fertui.site.presets import bands_of, limits_of
from fertui.workbench.glance import managed_point


class Aim(NamedTuple):
    """A band or a limit of one quantity at one point, in its unit; None: that side is open.

    Of kind ``analysed``: what a source water holds, both sides the same.
    """

    point: str
    what: str
    kind: str
    low: float | None
    high: float | None
    unit: str
    source: str

    @property
    def words(self) -> str:
        """The range with its unit.

        >>> Aim("feed", "K share", "band", 18.0, 28.0, "%", "own trial").words
        '18 to 28 %'
        >>> Aim("tank", "Na", "limit", None, 8.0, "mmol/L", "").words
        'at most 8 mmol/L'
        >>> Aim("water well", "Ca", "analysed", 1.3, 1.3, "mmol/L", "analysis 45").words
        '1.3 mmol/L'
        """
        if self.low is None and self.high is None:
            return "none"
        if self.low == self.high:
            text = f"{self.low:.3g}"
        elif self.low is None:
            text = f"at most {self.high:.3g}"
        elif self.high is None:
            text = f"at least {self.low:.3g}"
        else:
            text = f"{self.low:.3g} to {self.high:.3g}"
        return f"{text} {self.unit}".rstrip()


def aims(site: Site, loop: Loop) -> tuple[Aim, ...]:
    """Every band, then every limit, of the feed, the managed point, and any point the site or the loop names."""
    named = [point for ranges in (site.bands, site.limits, loop.bands, loop.limits) for point in ranges]
    found: list[Aim] = []
    for point in dict.fromkeys(("feed", managed_point(loop), *named)):
        found += _of("band", point, bands_of(site, loop, point))
        found += _of("limit", point, limits_of(site, loop, point))
    return tuple(found)


def analysed_waters(site: Site, as_analysed: Site) -> tuple[Aim, ...]:
    """What the logbook's analyses say of the source waters where that takes the place of the site file's numbers."""
    found = []
    for file_water, water in zip(site.waters, as_analysed.waters, strict=True):
        if water != file_water:
            each = water.composition
            numbers = {"EC": each.ec, "pH": each.ph, **each.ions, **each.micronutrients}
            found += [
                Aim(f"water {water.name}", what, "analysed", value, value, unit_of(what), each.source)
                for what, value in numbers.items()
                if value is not None
            ]
    return tuple(found)


def _of(kind: str, point: str, ranges: Mapping[str, Sourced]) -> list[Aim]:
    return [
        Aim(point, what, kind, each.low, each.high, unit_of(what), each.source or "site.toml")
        for what, each in ranges.items()
    ]


def unit_of(what: str) -> str:
    """The unit of a quantity that has a band or a limit.

    >>> [unit_of(what) for what in ("K share", "EC", "pH", "Na", "HCO3", "Fe")]
    ['%', 'mS/cm', '', 'mmol/L', 'meq/L', 'umol/L']
    """
    if what.endswith(" share"):
        return "%"
    if what in MICRONUTRIENTS:
        return "umol/L"
    return {"EC": "mS/cm", "pH": "", "HCO3": "meq/L"}.get(what, "mmol/L")
