"""Sheets, handover and report as text, CSV and JSON."""
