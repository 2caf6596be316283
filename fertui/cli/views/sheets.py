"""The JSON of stock-tank and acid sheets."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from fertui.cli.views import as_json
from fertui.cli.views.plan import tanks

if TYPE_CHECKING:
    from fertui.planning.last_mix import LastMix
    from fertui.planning.values import AcidSheet, StockSheet


def stock_document(sheet: StockSheet) -> dict[str, Any]:
    """The contract of ``stock --json``."""
    return {
        "schema": "fertui.stock/1",
        "feasible": sheet.feasible,
        "tanks": tanks(sheet),
        "refused": [{"pair": list(each.pair), "why": each.why} for each in sheet.refused],
        "reached_mmol_L": sheet.ions_mmol_l,
        "reached_umol_L": sheet.micros_umol_l,
        "asked_mmol_L": sheet.asked_mmol_l,
        "EC_mS_cm": sheet.ec,
        "notices": list(sheet.notices),
        "cautions": [as_json.plain(each) for each in sheet.cautions],
    }


def last_mix_text(mixes: Sequence[LastMix]) -> str:
    """The last mix of every stock tank as a sum to check by hand."""
    from fertui.paper.page import folded

    if not mixes:
        return (
            "No stock use is logged, so the last mix cannot be reckoned: log stock with 'fertui record SITE stock ...'."
        )
    return "\n".join(line for each in mixes for line in folded(f"{each.tank}: {each.words}", ""))


def acid_document(sheet: AcidSheet) -> dict[str, Any]:
    """``acid --json``."""
    return {"schema": "fertui.acid/1", **as_json.plain(sheet)}
