"""The acid sheet: cautions first, then splits with wait, retest and stop, each to be signed."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import TYPE_CHECKING

from fertui.paper.cautions import read_first
from fertui.paper.page import SIGN, Page, folded, heading, listed, page, section

if TYPE_CHECKING:
    from fertui.planning.acid import AcidSheet

SHORT_UNDER_L = 1.0


HOW_RELEASED = (
    "the portions are held back: read the cautions above and the strength on the label, then ask again with "
    "--cautions-read --label-strength PERCENT"
)


def acid_page(sheet: AcidSheet, loop: str, site: str, released: bool = True) -> Page:
    """Acid for one volume of water; with the reason where there is no dose.

    Not ``released``: cautions and bottle alone, until somebody has read them.
    """
    lines = heading(f"Acid: {loop}", site, *_water(sheet)) + read_first(sheet.cautions)
    if not sheet.feasible:
        lines += section("NO DOSE", folded(sheet.reason or "", "!! "))
    if sheet.splits and not released:
        return page([*lines, *_label(sheet), *section("HELD BACK", folded(HOW_RELEASED, "!! "))], {"loop": loop}, ())
    if sheet.splits:
        lines += _label(sheet) + section("HOW", listed(sheet.words)) + _splits(sheet)
        lines += section("WHAT IT FEEDS", listed(fed(sheet.adds_mmol_l, sheet.adds_mg_l, _counted(sheet))))
    else:
        lines += section("HOW", listed(sheet.words))
    lines += section("THE SUM, STEP BY STEP", listed(sheet.arithmetic, "  "))
    return page(lines, {"loop": loop, "feasible": sheet.feasible}, _rows(sheet), advice=True)


def litres(value: float) -> str:
    """Litres as a measuring jug shows them.

    >>> litres(0.2874), litres(33.62)
    ('287 mL', '33.6 L')
    """
    return f"{1000.0 * value:.0f} mL" if value < SHORT_UNDER_L else f"{value:.1f} L"


def fed(adds_mmol_l: Mapping[str, float], adds_mg_l: Mapping[str, float], counted: str) -> list[str]:
    """What an acid brings beside its acidity, and who takes it off the salts."""
    ions = ", ".join(f"{mmol:.2f} mmol/L {ion}" for ion, mmol in adds_mmol_l.items())
    elements = ", ".join(f"{mg:.0f} mg/L {element}" for element, mg in adds_mg_l.items())
    return [f"{ions} ({elements}): {counted}"] if ions else []


def _counted(sheet: AcidSheet) -> str:
    from fertui.planning.acid import counted_words

    return counted_words((sheet.alkalinity_meq_l or 0.0) >= sheet.leave_meq_l)


def _water(sheet: AcidSheet) -> list[str]:
    """What the dose is for, and where its alkalinity is known from."""
    known = "not known" if sheet.alkalinity_meq_l is None else f"{sheet.alkalinity_meq_l:.2f} meq/L"
    water = f"{sheet.volume_l:.0f} L of make-up water, alkalinity {known}, {sheet.leave_meq_l:g} meq/L to be left"
    return [water, *([f"alkalinity from: {sheet.alkalinity_from}"] if sheet.alkalinity_from else [])]


def _label(sheet: AcidSheet) -> list[str]:
    """What the bottle must say before anything is poured, and who is there."""
    counted = (
        f"counted on: {sheet.acid}, {sheet.strength_pct:g} % by weight, {sheet.density_kg_per_l:.3f} kg/L, "
        f"{sheet.mol_per_l:.2f} mol/L"
    )
    return section(
        "THE BOTTLE",
        [*folded(counted), "  read off the label: ______ %   the same [ ]   not: stop and plan again [ ]",
         "  second person who knows: __________   eyewash, shower tried [ ]   gear on [ ]"],
    )  # fmt: skip


def _splits(sheet: AcidSheet) -> list[str]:
    lye = (sheet.alkalinity_meq_l or 0.0) < sheet.leave_meq_l
    lines = []
    for split in sheet.splits:
        go_on = (
            f"wait {split.wait_min:.0f} min, retest; go on only {'below' if lye else 'above'} pH {split.retest_ph:.1f}"
        )
        stop = "" if lye else f"; stop everything at pH {split.stop_ph:.1f}"
        lines += folded(f"{split.number}. {litres(split.litres)} slowly into the moving water; {go_on}{stop}", "[ ] ")
        lines += ["    pH before ______   pH after ______   at ______", f"    {SIGN}"]
    total = sum(split.litres for split in sheet.splits)
    return section("PORTIONS", [*lines, f"    in all, if every retest allows it: {total:.2f} L"])


def _rows(sheet: AcidSheet) -> Iterable[tuple[str, ...]]:
    yield "split", "acid", "strength [%]", "litres [L]", "wait [min]", "go on above [pH]", "stop at [pH]"
    for each in sheet.splits:
        numbers = (each.litres, each.wait_min, each.retest_ph, each.stop_ph)
        yield str(each.number), sheet.acid, f"{sheet.strength_pct:g}", *(amount_exact(number) for number in numbers)


def amount_exact(value: float) -> str:
    """A number for a table: three digits after the point at most.

    >>> amount_exact(0.28742), amount_exact(15.0)
    ('0.287', '15')
    """
    return f"{round(value, 3):g}"
