"""Cautions: by strength, by pair, always the data sheet first."""

from __future__ import annotations

import re
from types import SimpleNamespace
from typing import Any

import pytest

from fertui.catalogue.acids import acids
from fertui.catalogue.cautions import (
    SEVERITIES,
    cautions_for,
    cautions_of,
    families,
    first,
    incompatibilities,
    loop_cautions,
)
from fertui.catalogue.figures import table
from fertui.catalogue.safety_page import safety_tables
from fertui.catalogue.salts import salts

KINDS = [each.name for each in (*salts(), *acids())]


def supply(kind: str, strength: float | None = None) -> Any:
    return SimpleNamespace(name=kind, kind=kind, label_pct={}, strength_pct=strength)


def codes(cautions: Any) -> set[str]:
    return {each.code for each in cautions}


def statement_codes(kind: str, strength: float | None = None) -> set[str]:
    labels = (each.text for each in cautions_for(kind, strength) if each.code.startswith("label-"))
    return {code for text in labels for code in re.findall(r"\b(?:EU)?H\d{3}\b", text)}


@pytest.mark.parametrize("kind", KINDS)
def test_everything_on_a_shelf_has_cautions_and_the_data_sheet_first(kind: str) -> None:
    found = cautions_for(kind)
    assert found[0] == first()
    assert len(found) > 1
    for each in found:
        assert each.severity in SEVERITIES
        assert each.text.endswith(".")
        assert each.source


# Classification by strength: Regulation (EC) 1272/2008, Annex VI entries 007-030-00-3 (nitric), 015-011-00-6
# (phosphoric), 016-020-00-8 (sulfuric), 019-002-00-8 (KOH), and hazard sheets of the German accident insurers (seen).
@pytest.mark.parametrize(
    ("kind", "strength", "present", "absent"),
    [
        ("nitric acid", 0.5, set(), {"H314", "H315", "H331"}),
        ("nitric acid", 2, {"H315", "H319"}, {"H314"}),
        ("nitric acid", 4, {"H315", "H318"}, {"H314"}),
        ("nitric acid", 5, {"H290", "H332", "H314"}, {"H331", "EUH071"}),
        ("nitric acid", 20, {"H332", "H314", "EUH071"}, {"H331"}),
        ("nitric acid", 25.9, {"H332"}, {"H331"}),
        ("nitric acid", 26, {"H331", "H314", "EUH071"}, {"H332", "H272"}),
        ("nitric acid", 64.9, {"H331"}, {"H272"}),
        ("nitric acid", 65, {"H272", "H331"}, {"H330"}),
        ("nitric acid", 70, {"H272", "H331"}, {"H330"}),
        ("nitric acid", 75, {"H330", "H272"}, {"H331"}),
        ("phosphoric acid", 9, set(), {"H314", "H315"}),
        ("phosphoric acid", 10, {"H315", "H319"}, {"H314"}),
        ("phosphoric acid", 25, {"H290", "H314"}, {"H302"}),
        ("phosphoric acid", 75, {"H302", "H314"}, set()),
        ("sulfuric acid", 10, {"H315", "H319"}, {"H314"}),
        ("sulfuric acid", 15, {"H314", "H290"}, set()),
        ("potassium hydroxide", 1, {"H315", "H319"}, {"H314"}),
        ("potassium hydroxide", 2, {"H314"}, {"H302"}),
        ("potassium hydroxide", 50, {"H290", "H302", "H314"}, set()),
        ("calcium nitrate double salt", None, {"H302", "H318"}, {"H272"}),
        ("potassium nitrate", None, {"H272"}, set()),
        ("ammonium nitrate", None, {"H272", "H319"}, set()),
    ],
)
def test_statements_follow_the_strength(kind: str, strength: float | None, present: set[str], absent: set[str]) -> None:
    found = statement_codes(kind, strength)
    assert present <= found
    assert not absent & found


def test_bands_of_strength_neither_overlap_nor_leave_gaps() -> None:
    for entry in table("cautions")["hazards"]:
        for lower, upper in zip(entry["bands"], entry["bands"][1:], strict=False):
            assert lower["below_pct"] == upper["from_pct"], entry["of"]


def test_every_code_of_the_data_leads_somewhere() -> None:
    data = table("cautions")
    known = {code for each in (*salts(), *acids()) for code in each.cautions}
    assert {of for card in data["cautions"] for of in card["of"]} <= known
    assert {each["of"] for each in (*data["hazards"], *data["precursors"])} <= known
    reached = {family for kind in KINDS for family in families(kind)}
    assert {family for pair in data["pairs"] for family in pair["families"]} <= reached
    every = [card["code"] for key in ("cautions", "pairs", "loop") for card in data[key]]
    assert len(every) == len(set(every))


def test_the_label_names_the_strength_that_was_entered() -> None:
    label = next(each for each in cautions_of([supply("nitric acid", 38.0)]) if each.code == "label-nitric-acid")
    assert "38 %" in label.text
    assert "H331" in label.text


def test_acid_and_hypochlorite_on_one_shelf() -> None:
    """CDC MMWR 1991: even dilute bleach with phosphoric cleaner gave chlorine."""
    shelf = [supply("phosphoric acid", 4.0), supply("sodium hypochlorite")]
    shelf[1].label_pct = {"Cl": 5.0}
    found = cautions_of(shelf)
    assert "acid-hypochlorite" in codes(found)
    assert found[0] == first()
    ranks = [SEVERITIES.index(each.severity) for each in found[1:]]
    assert ranks == sorted(ranks)
    assert len(found) == len(set(found))


# Pairs named by issue of safety: chlorine (CDC MMWR 1991), carbon dioxide and heat (safety data sheets), gypsum and
# calcium phosphate (compatibility notes of extension services), silica gel (chemistry).
@pytest.mark.parametrize(
    ("kinds", "where", "expected"),
    [
        (["nitric acid", "sodium hypochlorite"], "shelf", {"acid-hypochlorite"}),
        (["nitric acid", "potassium carbonate"], "shelf", {"acid-alkali"}),
        (["nitric acid", "sodium chlorite"], "shelf", {"acid-chlorite"}),
        (["ammonium sulfate", "sodium hypochlorite"], "shelf", {"ammonium-hypochlorite"}),
        (["nitric acid", "sulfuric acid"], "shelf", {"nitric-sulfuric"}),
        (["nitric acid", "sulfuric acid"], "stock", set()),
        (["nitric acid", "potassium nitrate"], "shelf", {"oxidiser-acid"}),
        (["nitric acid", "potassium nitrate"], "stock", set()),
        (["calcium nitrate double salt", "magnesium sulfate"], "shelf", set()),
        (["calcium nitrate double salt", "magnesium sulfate"], "stock", {"calcium-sulfate"}),
        (["calcium nitrate double salt", "MKP"], "stock", {"calcium-phosphate"}),
        (
            ["calcium nitrate tetrahydrate", "phosphoric acid"],
            "stock",
            {"calcium-phosphoric-sulfuric"},
        ),
        (["potassium silicate", "calcium chloride dihydrate"], "stock", {"alkali-calcium"}),
        (["potassium silicate", "nitric acid"], "stock", {"silicate-acid", "acid-alkali"}),
        (["iron DTPA", "nitric acid"], "stock", {"chelate-acid"}),
        (["calcium nitrate tetrahydrate", "KNO3", "iron DTPA"], "stock", set()),
        (["KNO3", "K2SO4", "MKP", "magnesium sulfate", "boric acid"], "stock", set()),
    ],
)
def test_what_must_not_meet(kinds: list[str], where: str, expected: set[str]) -> None:
    assert codes(incompatibilities(kinds, where)) == expected
    assert codes(incompatibilities(reversed(kinds), where)) == expected


def test_one_substance_alone_meets_nothing() -> None:
    assert incompatibilities(["calcium nitrate double salt"] * 2, "stock") == ()


# Regulation (EU) 2019/1148, Annex I: nitric acid 3 %, sulfuric acid 15 %; Annex II: K and Ca nitrate (seen).
@pytest.mark.parametrize(
    ("kind", "strength", "regulated"),
    [
        ("nitric acid", 3, False),
        ("nitric acid", 3.1, True),
        ("sulfuric acid", 15, False),
        ("sulfuric acid", 37, True),
        ("phosphoric acid", 75, False),
        ("potassium nitrate", None, True),
        ("calcium nitrate double salt", None, True),
        ("ammonium nitrate", None, True),
        ("monopotassium phosphate", None, False),
    ],
)
def test_regulated_precursors(kind: str, strength: float | None, regulated: bool) -> None:
    assert any(each.startswith("precursor-") for each in codes(cautions_for(kind, strength))) is regulated


def test_cautions_of_the_loop() -> None:
    assert codes(loop_cautions()) >= {"backflow", "interlock"}


def test_acids_are_told_how_to_be_handled() -> None:
    for each in acids():
        if each.is_acid:
            assert codes(cautions_for(each.name, 10)) >= {"acid-protection", "acid-into-water", "acid-never-with"}


def test_the_safety_page_holds_every_caution() -> None:
    page = safety_tables()
    data = table("cautions")
    assert all(each["text"] in page for key in ("cautions", "pairs", "precursors", "loop") for each in data[key])
    assert all(f"- {code}: {said}" in page for code, said in data["statements"].items())
    assert data["first"]["text"] in page
