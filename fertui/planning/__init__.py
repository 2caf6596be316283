"""What to do next: recipe, hand doses, stock tanks, acid, renewal; in amounts a person can weigh, with the reasons."""

from fertui.planning.acid import AcidSheet, acid_sheet
from fertui.planning.plan import plan
from fertui.planning.shelf import PlanningError
from fertui.planning.stock import StockSheet, stock_sheet
from fertui.planning.values import Plan

__all__ = ["AcidSheet", "Plan", "PlanningError", "StockSheet", "acid_sheet", "plan", "stock_sheet"]
