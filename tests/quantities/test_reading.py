"""Values with unit and species: every combination goes there and back, or is refused for a stated reason."""

from __future__ import annotations

import contextlib
import math
import subprocess
import sys

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.chemistry.species import SPECIES
from fertui.quantities import QuantityError, column, concentration, in_unit, read, shown_in
from fertui.quantities.concentration import HARDNESS_IONS
from fertui.quantities.names import ALIASES, WITHOUT_MASS, form
from fertui.quantities.units import CANONICAL, FACTORS, PER_LITRE, fold

UNITS = [(basis, unit) for basis, units in PER_LITRE.items() for unit in units]
numbers = st.floats(1e-6, 1e5)


def fits(name: str, basis: str) -> bool:
    """Whether a form can be given in a unit: no equivalents without an agreed charge, degrees for hardness only."""
    if basis == "meq/L":
        return SPECIES[name].charge > 0
    return basis in ("mg/L", "mmol/L") or SPECIES[name].ion in HARDNESS_IONS


@settings(deadline=None)
@given(st.sampled_from(sorted(SPECIES)), st.sampled_from(UNITS), numbers)
def test_every_form_in_every_unit_goes_there_and_back(name: str, unit: tuple[str, str], number: float) -> None:
    basis, written = unit
    if not fits(name, basis):
        with pytest.raises(QuantityError):
            concentration(f"{number!r} {written}", name)
        return
    ion, canonical = concentration(f"{number!r} {written}", name)
    assert ion == SPECIES[name].ion
    assert in_unit(canonical, ion, written, name) == pytest.approx(number, rel=1e-12)


@pytest.mark.parametrize("name", SPECIES)
def test_a_head_and_its_cells_say_what_the_value_alone_says(name: str) -> None:
    for basis, unit in UNITS:
        if not fits(name, basis):
            with pytest.raises(QuantityError):
                column(f"{name} [{unit}]")
            continue
        head = column(f"{name} [{unit}]")
        cell = read("12,5", head.species or head.name, head.unit)
        assert (cell.name, cell.number) == concentration(f"12.5 {unit}", name)


@settings(deadline=None)
@given(
    st.sampled_from([(what, unit) for what, units in FACTORS.items() for unit in units if unit]), st.floats(1e-3, 10.0)
)
def test_every_other_unit_is_read_as_its_table_says(pair: tuple[str, str], number: float) -> None:
    what, unit = pair
    assert read(f"{number!r} {unit}", what).number == pytest.approx(number * FACTORS[what][unit], rel=1e-12)
    assert read(number, what, unit).number == pytest.approx(number * FACTORS[what][unit], rel=1e-12)


@given(st.floats(-100.0, 100.0))
def test_temperature_goes_there_and_back(celsius: float) -> None:
    assert read(f"{celsius * 1.8 + 32!r} F", "temperature").number == pytest.approx(celsius, abs=1e-9)


@pytest.mark.parametrize("ion", [*IONS, *MICRONUTRIENTS])
@pytest.mark.parametrize("unit", ["mmol/L", "meq/L", "mg/L"])
def test_what_a_screen_shows_is_read_back(ion: str, unit: str) -> None:
    shown, species = shown_in(ion, unit)
    assert concentration(f"{in_unit(3.25, ion, shown, species)!r} {shown}", species) == (ion, pytest.approx(3.25))


def test_names_of_forms_do_not_collide() -> None:
    names = [*SPECIES, *ALIASES, *WITHOUT_MASS]
    assert len({form(name).species.name + str(form(name).has_mass) for name in SPECIES}) == len(SPECIES)
    for name in SPECIES:
        assert form(name).species.name == name
    for name in names:
        assert form(name.lower()).species == form(name).species == form(name.upper()).species


@pytest.mark.parametrize("what", FACTORS)
def test_spellings_of_units_do_not_collide(what: str) -> None:
    spellings: dict[str, float] = {}
    for unit, worth in FACTORS[what].items():
        assert spellings.setdefault(fold(unit), worth) == worth


@pytest.mark.parametrize(
    ("name", "ion"),
    [
        ("NO\u2083\u207b", "NO3"), ("NO3-", "NO3"), ("Ca2+", "Ca"), ("Ca\u00b2\u207a", "Ca"), ("Ca++", "Ca"),
        ("SO4 2-", "SO4"), ("SO42-", "SO4"), ("H2PO4-", "H2PO4"), ("PO4 3-", "H2PO4"), ("NH4+", "NH4"), ("Fe", "Fe"),
        ("n-no3", "NO3"), ("NO3_N", "NO3"), ("PO4-P", "H2PO4"), ("SO4-S", "SO4"), ("Potassium", "K"), ("Mo", "Mo"),
        ("bicarbonate", "HCO3"), ("KS4,3", "HCO3"), ("HCO3-", "HCO3"), ("CO3--", "HCO3"),
    ],
)  # fmt: skip
def test_names_as_people_write_them(name: str, ion: str) -> None:
    assert concentration("1 mmol/L", name)[0] == ion


@pytest.mark.parametrize(
    ("text", "same"),
    [
        ("165 mg N/L", "165 mg/L N"), ("165 mg/l as N", "165 ppm N"), ("165 mg L-1 N", "165 mg/L (N)"),
        ("165 mg/litre N", "165 g/m3 N"),
    ],
)  # fmt: skip
def test_units_as_people_write_them(text: str, same: str) -> None:
    assert concentration(text, "NO3") == concentration(same, "NO3") == concentration("165 mg/L", "NO3-N")


@pytest.mark.parametrize(
    "text",
    [
        "2600 uS/cm", "2600 \u00b5S/cm", "2.6 dS m-1", "2.6 mS cm\u207b\u00b9", "2,6 mmho/cm", "0.26 S/m", "260 mS/m",
        "260 10^-5 S/cm", "260 x 10\u207b\u2075 S/cm", "260 1e-5 S/cm", "2.6", "2,6 mS",
    ],
)  # fmt: skip
def test_conductivity_as_people_write_it(text: str) -> None:
    assert read(text, "EC").number == pytest.approx(2.6)


@pytest.mark.parametrize(
    ("text", "what", "words"),
    [
        ("1200 ppm", "EC", "ppm' is not a unit of total strength"),
        ("1200 mg/L", "EC", "is not a unit of total strength"),
        ("10 mg/L", "N", "N does not say nitrate or ammonium"),
        ("10 dH", "hardness", "hardness is calcium and magnesium together"),
        ("10 dH", "K", "degree of hardness, not of K"),
        ("10 fH", "NO3", "degree of hardness, not of NO3"),
        ("2 meq/L", "P", "1 a mol on some reports and 3 on others"),
        ("2 meq/L", "PO4", "1 a mol on some reports and 3 on others"),
        ("2 meq/L", "Fe", "no agreed charge"),
        ("200 mg/L", "alkalinity", "the mass of what is not said. Allowed: CaCO3 or HCO3"),
        ("730 mg/L", "nitrate", "NO3 or NO3-N"),
        ("3", "P2O5", "P2O5 is given without a unit"),
        ("3 mmol/L", "Kalium", "is not an ion this program knows"),
        ("3 furlong", "K", "is not a unit of concentration"),
        ("3 mS/cm", "K", "is not a unit of concentration"),
        ("3 oz/gal", "K", "is not a unit of concentration"),
        ("10 mg/L P2O5", "K", "do not go together"),
        ("10 mg/L NO3", "NO3-N", "do not go together"),
        ("-1 mmol/L", "K", "is negative"),
        ("59", "pH", "pH 59 cannot be"),
        ("3 L/m2", "litres", "amount per area"),
        ("3 mm", "litres", "amount per area"),
        ("100 gal", "litres", "is a US or an imperial gallon"),
        ("3 barrel", "litres", "is not a unit for litres"),
        ("3 ton", "kg", "a metric, a short or a long ton"),
        ("30 mol/m2", "light", "counts photons, not energy"),
        ("20 K", "temperature", "is not a unit of temperature"),
        ("9**9**9 mg/L", "K", "is not a unit of concentration"),
    ],
)
def test_refused_in_words(text: str, what: str, words: str) -> None:
    with pytest.raises(QuantityError) as refused:
        read(text, what)
    assert words in str(refused.value)


def test_negative_is_for_alkalinity_and_temperature() -> None:
    assert concentration("-0.5 meq/L", "alkalinity") == ("HCO3", -0.5)
    assert read("-3 C", "temperature").number == -3.0


def test_a_value_keeps_what_was_written() -> None:
    value = read("<0,1 mg/L", "NH4-N")
    assert (value.text, value.unit, value.species, value.below) == ("<0,1 mg/L", "mg/L", "NH4-N", True)
    assert read("7.2", "K").species == read("7.2", "K").unit == ""
    assert read("120 ppm CaCO3", "alkalinity").species == "CaCO3"
    assert read("2.4 meq/L", "alkalinity").species == "alkalinity"


@pytest.mark.parametrize(
    ("head", "parsed"),
    [
        ("NO3-N [mg/L]", ("NO3", "mg/L", "NO3-N")), ("alkalinity [mg/L CaCO3]", ("HCO3", "mg/L", "CaCO3")),
        ("EC [10^-5 S/cm]", ("EC", "10^-5 S/cm", "")), ("K_mmol_L", ("K", "mmol/L", "")),
        ("PO4_mmol_L", ("H2PO4", "mmol/L", "PO4")), ("EC_mS_cm", ("EC", "mS/cm", "")),
        ("NO3_N_mg_L", ("NO3", "mg/L", "NO3-N")), ("Fe_umol_L", ("Fe", "umol/L", "")), ("pH", ("pH", "", "")),
        ("K", ("K", "", "")), ("Ca (mg/L)", ("Ca", "mg/L", "")),
        ("light_sum [J/cm2]", ("light_sum", "J/cm2", "")), ("make_up [m3]", ("make_up", "m3", "")),
        ("drain_pct", ("drain_pct", "", "")), ("date", ("date", "", "")),
        ("Ca [mg/L CaCO3]", ("Ca", "mg/L", "Ca as CaCO3")),
        ("NO3-N mg/L", ("NO3", "mg/L", "NO3-N")), ("K, mmol/L", ("K", "mmol/L", "")), ("EC mS/cm", ("EC", "mS/cm", "")),
        ("B1 [L]", ("B1", "L", "")), ("K2", ("K2", "", "")), ("Ca+2 [mmol/L]", ("Ca", "mmol/L", "")),
        ("remark " * 20, (("remark " * 20).strip(), "", "")), ("temperature [F]", ("temperature", "F", "")),
        ("alkalinity [meq/L]", ("HCO3", "meq/L", "alkalinity")),
    ],
)  # fmt: skip
def test_heads(head: str, parsed: tuple[str, str, str]) -> None:
    assert column(head) == parsed


@pytest.mark.parametrize(
    "head", ["alkalinity [mg/L]", "EC [ppm]", "K [furlong]", "N [mg/L]", "TDS [ppm]", "P [meq/L]", "K" * 300, ""]
)
def test_heads_that_do_not_say_enough_are_refused(head: str) -> None:
    with pytest.raises(QuantityError):
        column(head)


@settings(deadline=None)
@given(st.text(max_size=70), st.sampled_from([*SPECIES, *CANONICAL, "nitrate", "alkalinity"]), st.text(max_size=20))
def test_any_text_is_read_or_refused(text: str, what: str, unit: str) -> None:
    for attempt in (text, f"1 {text}"):
        with contextlib.suppress(QuantityError):
            assert math.isfinite(read(attempt, what, unit).number)


@settings(deadline=None)
@given(st.text(max_size=70))
def test_any_head_is_read_or_refused(head: str) -> None:
    with contextlib.suppress(QuantityError):
        assert column(head).name


def test_common_values_load_neither_numpy_nor_pint() -> None:
    """Reading and showing common units must not cost the start of a screen."""
    code = (
        "import sys; from fertui.quantities import column, concentration, in_unit, read;"
        "concentration('730 mg/L', 'NO3-N'); read('2,6', 'EC'); in_unit(5.0, 'Ca', 'mg/L'); column('K [mmol/L]');"
        "print([name for name in ('numpy', 'pint', 'scipy') if name in sys.modules])"
    )
    assert (
        subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.strip() == "[]"
    )


def test_an_odd_unit_goes_through_pint() -> None:
    """1 oz/ft3 = 28.3495 g / 28.3168 L (definitions of both)."""
    assert concentration("1 oz/ft^3", "K")[1] == pytest.approx(28349.523 / 28.316847 / 39.098, rel=1e-5)
