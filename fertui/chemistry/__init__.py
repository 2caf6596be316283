"""Water chemistry of dilute nutrient solutions: pure functions on numpy arrays whose last axis is the ion.

Knows nothing of greenhouses. Units: mmol/L, meq/L, degrees C, mS/cm; HCO3 stands for alkalinity [meq/L].
"""
