"""Sheets, handover and report as text, CSV and JSON."""

from fertui.paper.page import Page

__all__ = ["Page"]
