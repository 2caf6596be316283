"""What to do next: recipe, hand doses, stock tanks, acid, renewal; in amounts a person can weigh, with the reasons."""

from fertui.planning.acid import AcidSheet, acid_sheet, first_acid
from fertui.planning.last_mix import LastMix, last_mix
from fertui.planning.plan import plan
from fertui.planning.shelf import PlanningError
from fertui.planning.stock import StockSheet, stock_sheet
from fertui.planning.values import Plan

__all__ = [
    "AcidSheet",
    "LastMix",
    "Plan",
    "PlanningError",
    "StockSheet",
    "acid_sheet",
    "first_acid",
    "last_mix",
    "plan",
    "stock_sheet",
]
