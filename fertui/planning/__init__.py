"""What to do next: recipe, hand doses, stock tanks, acid and renewal, in amounts a person can weigh, with the
reasons."""

from fertui.planning.acid import AcidSheet, acid_sheet
from fertui.planning.shelf import PlanningError
from fertui.planning.stock import StockSheet, stock_sheet

__all__ = ["AcidSheet", "PlanningError", "StockSheet", "acid_sheet", "stock_sheet"]
