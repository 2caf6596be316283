"""Kilograms of published stock-tank recipes, weighed out through the catalogue, give the published solutions."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import pytest

from fertui.catalogue.crops import targets
from fertui.catalogue.salts import salt
from fertui.catalogue.supplies import contents


def supply(kind: str, label: dict[str, float] | None = None, strength: float | None = None) -> Any:
    return SimpleNamespace(name=kind, kind=kind, label_pct=label or {}, strength_pct=strength)


def dissolved(weighed: list[tuple[Any, float]], litres: float) -> dict[str, float]:
    """mmol/L of kilograms in litres."""
    total: dict[str, float] = {}
    for each, kg in weighed:
        for ion, mmol in contents(each).items():
            total[ion] = total.get(ion, 0.0) + kg * mmol / litres
    return total


def test_dutch_tomato_tanks() -> None:
    """Dutch nutrient-solution booklet 2016 (second-hand): two tanks of 1000 L, 100x, kg as printed; solution mmol/L and
    umol/L as printed. The tanks hold magnesium sulfate of 16 % MgO, chelates and borates by their labels."""
    weighed = [
        (supply("calcium nitrate double salt"), 106),
        (supply("KNO3"), 23 + 20),
        (supply("calcium chloride anhydrous"), 6),
        (supply("K2SO4"), 35),
        (supply("MKP"), 17),
        (supply("magnesium sulfate", {"MgO": 16}), 59),
        (supply("MAP"), 3),
        (supply("iron DTPA", {"Fe": 6}), 1.396),
        (supply("manganese EDTA", {"Mn": 12.8}), 0.429),
        (supply("zinc EDTA", {"Zn": 14.8}), 0.221),
        (supply("copper EDTA", {"Cu": 14.8}), 0.032),
        (supply("borax", {"B": 11.3}), 0.287),
        (supply("sodium molybdate", {"Mo": 39.6}), 0.012),
    ]
    found = dissolved(weighed, 1000 * 100)
    printed = {"NH4": 1.2, "K": 9.5, "Ca": 5.4, "Mg": 2.4, "NO3": 15, "Cl": 1, "SO4": 4.4, "H2PO4": 1.5}
    for ion, mmol in printed.items():
        assert found[ion] == pytest.approx(mmol, abs=0.1), ion
    micronutrients = {"Fe": 15, "Mn": 10, "Zn": 5, "B": 30, "Cu": 0.75, "Mo": 0.5}
    for ion, umol in micronutrients.items():
        assert 1000 * found[ion] == pytest.approx(umol, rel=0.02), ion


def test_tuscan_example_line_by_line() -> None:
    """Quaderno ARSIA 5/2004, pp. 178-181: mg of each product per litre, printed mg/L of element; labels as there."""
    weighed = [
        (supply("calcium nitrate double salt", {"Ca": 19, "NO3-N": 14.5, "NH4-N": 1}), 521),
        (supply("ammonium nitrate", {"NO3-N": 17, "NH4-N": 17}), 28.2),
        (supply("MKP", {"P": 23, "K": 28}), 173.9),
        (supply("magnesium sulfate", {"Mg": 9.9, "S": 13}), 121.2),
        (supply("KNO3", {"NO3-N": 13, "K": 38.1}), 175.4),
        (supply("K2SO4", {"K": 43, "S": 17}), 141.86),
    ]
    found = dissolved([(each, mg * 1e-6) for each, mg in weighed], 1.0)
    acid = 0.132e-3 * 14.5e3
    water = {"K": 3.5, "Ca": 61.0, "Mg": 18.0, "S": 10.0}
    assert (found["NO3"] + acid) * 14.007 == pytest.approx(130, abs=0.5)
    assert found["NH4"] * 14.007 == pytest.approx(10.0, abs=0.1)
    assert found["H2PO4"] * 30.974 == pytest.approx(40, abs=0.1)
    assert found["K"] * 39.098 + water["K"] == pytest.approx(180, abs=0.5)
    assert found["Ca"] * 40.078 + water["Ca"] == pytest.approx(160, abs=0.1)
    assert found["Mg"] * 24.305 + water["Mg"] == pytest.approx(30, abs=0.1)
    assert found["SO4"] * 32.06 + water["S"] == pytest.approx(49.9, abs=0.1)


@pytest.mark.parametrize(
    ("name", "salts"),
    [
        ("hoagland-1", {"KNO3": 5, "Ca(NO3)2.4H2O": 5, "KH2PO4": 1, "MgSO4.7H2O": 2}),
        ("hoagland-2", {"KNO3": 6, "Ca(NO3)2.4H2O": 4, "NH4H2PO4": 1, "MgSO4.7H2O": 2}),
    ],
)
def test_hoagland_stock_volumes(name: str, salts: dict[str, float]) -> None:
    """mmol of each salt per litre: mL of 1 M stocks of Hoagland & Arnon 1950, Circular 347 (Hershey 1997)."""
    weighed = [(supply(formula), mmol * salt(formula).molar_mass * 1e-6) for formula, mmol in salts.items()]
    found = dissolved(weighed, 1.0)
    for ion, mmol in targets()[name].ions.items():
        assert found.get(ion, 0.0) == pytest.approx(mmol, abs=1e-9), ion


def test_chapingo_salts_per_cubic_metre() -> None:
    """Chapingo class notes (seen): 1228 g anhydrous Ca(NO3)2 -> 209.68 mg/L N, 646.48 g KNO3 -> 89.58 N, 760 g
    MgSO4.7H2O -> Mg 75, S 98.85, 1.96 g CuSO4.5H2O -> Cu 0.5, each in 1000 L."""
    anhydrous = 164.088 / 236.15
    nitrate = dissolved([(supply("calcium nitrate tetrahydrate"), 1.228 / anhydrous)], 1000)["NO3"]
    assert nitrate * 14.007 == pytest.approx(209.68, rel=1e-3)
    assert dissolved([(supply("KNO3"), 0.64648)], 1000)["NO3"] * 14.007 == pytest.approx(89.58, rel=1e-3)
    magnesium = dissolved([(supply("MgSO4.7H2O"), 0.760)], 1000)
    assert magnesium["Mg"] * 24.305 == pytest.approx(75, rel=1e-3)
    assert magnesium["SO4"] * 32.06 == pytest.approx(98.85, rel=1e-3)
    assert dissolved([(supply("CuSO4.5H2O"), 0.00196)], 1000)["Cu"] * 63.546 == pytest.approx(0.5, rel=0.01)
