"""A new site, from arguments and from answers as texts."""

from __future__ import annotations

from itertools import product
from pathlib import Path
from typing import Any

import pytest

from fertui.catalogue.crops import crops
from fertui.catalogue.media import media
from fertui.site.checks import SiteError
from fertui.site.files import read_site
from fertui.site.model import LAYOUTS
from fertui.site.new import COMMON_SALTS, first_steps, machine_timezone, new_site, refuse_place, supply_from
from fertui.site.questions import new_site_from, questions

NFT = {"crop": "lettuce", "medium": "none", "layout": "shared-tank", "area": "400", "tank": "2000"}


@pytest.mark.parametrize(
    ("crop", "medium", "layout"),
    [
        *product([each.name for each in crops()], ["coir"], LAYOUTS),
        *product(["rose"], [each.name for each in media()], LAYOUTS),
    ],
)
def test_every_crop_medium_and_layout_makes_a_site(tmp_path: Path, crop: str, medium: str, layout: str) -> None:
    site = new_site(tmp_path / "s", crop=crop, medium=medium, layout=layout, area_m2=1000, tank_l=3000)
    assert read_site(tmp_path / "s") == site
    loop = site.loops[0]
    assert loop.water in [each.name for each in site.waters]
    assert loop.feed_ec
    assert loop.crop_water_l_per_m2_d
    assert len(site.supplies) == len(COMMON_SALTS)
    assert bool(loop.stock_tanks) == (layout != "known-feed")
    for ranges in (*loop.bands.values(), *loop.limits.values()):
        assert all(each.source for each in ranges.values())


def test_defaults_say_where_they_come_from(tmp_path: Path) -> None:
    loop = new_site(tmp_path, crop="tomato", medium="coir", layout="drain-blend", area_m2=1200).loops[0]
    assert set(loop.sources) == {
        "root_zone_water_l_per_m2", "drain_store_l", "feed_EC", "crop_water_l_per_m2_d", "drain_fraction",
    }  # fmt: skip
    assert "unverified preset" in loop.sources["crop_water_l_per_m2_d"]
    assert "unverified preset" in (tmp_path / "site.toml").read_text()


def test_what_the_grower_says_is_not_called_a_preset(tmp_path: Path) -> None:
    loop = new_site(
        tmp_path, crop="tomato", medium="coir", layout="drain-blend", area_m2=1200, drain_store_l=2500,
        root_zone_water_l_per_m2=7.0,
    ).loops[0]  # fmt: skip
    assert loop.drain_store_l == 2500
    assert not {"drain_store_l", "root_zone_water_l_per_m2"} & set(loop.sources)


def test_a_site_is_never_overwritten(tmp_path: Path) -> None:
    new_site_from(tmp_path, NFT)
    before = (tmp_path / "site.toml").read_bytes()
    with pytest.raises(SiteError, match="already"):
        new_site_from(tmp_path, NFT)
    assert (tmp_path / "site.toml").read_bytes() == before


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"area": None}, r"--area: How many m2 .*\? This has to be known"),
        ({"tank": None}, "--tank: How many litres"),
        ({"crop": "?"}, r"--crop: Which crop\? This has to be known"),
        ({"crop": "letuce"}, "lettuce"),
        ({"medium": "wool"}, "stone-wool"),
        ({"layout": "tank"}, "shared-tank"),
        ({"area": "-4"}, "0.01 to 10,000,000 m2"),
        ({"area": "nan"}, "0.01 to"),
        ({"area": "about 400"}, "'about 400' does not begin with a number: a number from 0.01 to 10,000,000 m2 or ha"),
        ({"area": "4 acres"}, "'acres' is not a unit for area. Allowed: m2, ha"),
        ({"tank": "0"}, "--tank: '0': a number from 0.1"),
        ({"tank": "2.5 L/m2"}, "Enter litres of the whole loop"),
        ({"target": "hoagland"}, "hoagland-1"),
        ({"supplies": "KNO3, calcium nitrate"}, "double salt"),
        ({"supplies": "nitric acid"}, "'nitric acid' needs the strength on its label"),
        ({"supplies": "phosphoric acid 59, KNO3"}, "'phosphoric acid 59': per cent by weight"),
        ({"supplies": "phosphoric acd 59 %"}, "nearest: phosphoric acid"),
        ({"supplies": "blend"}, "label"),
        ({"supplies": "nitric acid 99 %"}, "up to 70 %"),
        ({"supplies": "KNO3 38 %"}, "acid or chelate"),
        ({"timezone": "Europe/Rom"}, "Europe/Rome"),
        ({"loop": "x" * 100}, "1 to 60"),
        ({"name": "a\x07b"}, "control characters"),
        ({"stage": "blossom"}, "--stage: 'blossom' is not one of standard"),
        ({"crop": "sweet-pepper", "stage": "high-water"}, "'high-water' is not one of standard, fruit-set"),
        ({"water": "w" * 61}, "--water: .* 1 to 60 characters"),
        ({"tanks": "3"}, "did you mean tank?"),
    ],
)
def test_a_refused_answer_leaves_nothing_behind(tmp_path: Path, change: dict[str, Any], says: str) -> None:
    with pytest.raises(SiteError, match=says):
        new_site_from(tmp_path / "s", {**NFT, **change})
    assert not (tmp_path / "s").exists()


def test_answers_in_the_grower_s_own_writing(tmp_path: Path) -> None:
    said = {**NFT, "crop": "Salad", "area": "412,5 m2", "layout": "Shared tank", "tank": "0.7 m3", "medium": "None"}
    loop = new_site_from(tmp_path, said).loops[0]
    assert (loop.crop, loop.area_m2, loop.tank_l, loop.medium) == ("lettuce", 412.5, 700.0, "none")


def test_water_called_pure_has_no_ions_and_other_water_is_unknown(tmp_path: Path) -> None:
    pure = new_site_from(tmp_path / "a", {**NFT, "water": "rain"}).waters[0].composition
    assert set(pure.ions.values()) == {0.0}
    assert not new_site_from(tmp_path / "b", {**NFT, "water": "well"}).waters[0].composition.ions


@pytest.mark.parametrize(
    ("text", "kind", "strength", "label"),
    [
        ("nitric acid 60 %", "nitric acid", 60.0, {}),
        ("HNO3 38%", "nitric acid", 38.0, {}),
        ("phosphoric 59,5 %", "phosphoric acid", 59.5, {}),
        ("iron DTPA 11 %", "iron DTPA", None, {"Fe": 11.0}),
        ("Epsom salt", "magnesium sulfate heptahydrate", None, {}),
        ("Ca(NO3)2.4H2O", "calcium nitrate tetrahydrate", None, {}),
    ],
)
def test_supplies_as_people_write_them(text: str, kind: str, strength: float | None, label: dict[str, float]) -> None:
    found = supply_from(text)
    assert (found.kind, found.strength_pct, dict(found.label_pct)) == (kind, strength, label)


def test_a_list_of_supplies_may_hold_a_decimal_comma(tmp_path: Path) -> None:
    site = new_site_from(tmp_path, {**NFT, "supplies": "KNO3,5Ca(NO3)2.NH4NO3.10H2O, nitric acid 59,5 %"})
    assert [each.name for each in site.supplies][1:] == ["calcium nitrate double salt", "nitric acid 59.5 %"]


@pytest.mark.parametrize("between", [",", ";", "; ", "\n"])
def test_supplies_may_stand_between_commas_semicolons_or_lines(tmp_path: Path, between: str) -> None:
    said = between.join(["KNO3", "potassium nitrate", "phosphoric acid 59,5 %", "MKP"])
    site = new_site_from(tmp_path, {**NFT, "supplies": said})
    assert [each.name for each in site.supplies] == [
        "potassium nitrate", "phosphoric acid 59.5 %", "monopotassium phosphate",
    ]  # fmt: skip


def test_what_was_understood_reads_back_to_the_same() -> None:
    answers = {
        "crop": "tomato", "stage": "fruit-set", "area": "1,2 ha", "layout": "Drain blend", "medium": "rockwool",
        "drain-store": "20 m3", "medium-volume": "9", "root-zone-water": "6 mm", "water": "well", "target": "Steiner",
        "water-report": "EC 0,5; Ca 52 mg/L, CaCO3 145 mg/L",
        "supplies": "KNO3; HNO3 38%; iron DTPA 11 %", "loop": "north", "name": "home", "timezone": "Europe/Rome",
        "tank": "3 m3",
    }  # fmt: skip
    understood: dict[str, str] = {}
    for each in questions():
        value = each.read(answers[each.option], understood)
        understood[each.option] = each.understood(value)
        assert each.read(understood[each.option], understood) == value
    assert understood["medium"] == "stone-wool"
    assert understood["area"] == "12000 m2"
    assert understood["drain-store"] == "20000 L"
    assert understood["root-zone-water"] == "6 L/m2"
    assert understood["supplies"] == "potassium nitrate, nitric acid 38 %, iron DTPA 11 %"


def test_what_is_taken_instead_of_an_answer_is_said_in_the_unit_asked_for() -> None:
    by_option = {each.option: each for each in questions()}
    answers = {"crop": "sweet-pepper", "area": "800 m2", "layout": "drain-blend", "medium": "peat"}

    def instead(option: str) -> str:
        taken = by_option[option].instead
        return "" if taken is None else taken(answers)

    assert instead("drain-store") == "2000 L"
    assert instead("medium-volume") == "12 L/m2"
    assert instead("root-zone-water") == "6.60 L/m2"
    assert instead("loop") == "sweet-pepper"
    answers["medium-volume"] = "10 L/m2"
    assert instead("root-zone-water") == "5.50 L/m2"


def test_a_folder_that_cannot_be_made_is_refused_beforehand(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("not a folder")
    with pytest.raises(SiteError, match="no folder that you may write to"):
        refuse_place(tmp_path / "file" / "site")
    refuse_place(tmp_path / "new" / "deep" / "site")


def test_the_order_of_the_questions_is_the_one_growers_know_answers_in() -> None:
    order = [each.option for each in questions()]
    assert order[:5] == ["crop", "stage", "area", "layout", "medium"]
    assert order[-1] == "timezone"
    for each in questions():
        assert each.prompt.endswith("?")
        assert each.explanation.endswith(".")


def test_only_what_matters_is_asked() -> None:
    def asked(**answers: str) -> set[str]:
        return {each.option for each in questions() if each.applies(answers)}

    nft = asked(crop="lettuce", layout="shared-tank", medium="none")
    assert "tank" in nft
    assert not {"drain-store", "medium-volume", "root-zone-water", "stage"} & nft
    slabs = asked(crop="tomato", layout="drain-blend", medium="coir")
    assert {"drain-store", "medium-volume", "stage"} <= slabs
    assert "tank" not in slabs


@pytest.mark.parametrize("option", [each.option for each in questions() if each.instead])
@pytest.mark.parametrize("said", ["", "?", "I do not know"])
def test_i_do_not_know_is_an_answer_where_the_model_can_live_with_it(tmp_path: Path, option: str, said: str) -> None:
    given = {"crop": "tomato", "medium": "coir", "layout": "drain-blend", "area": "1200", option: said}
    assert new_site_from(tmp_path, given).loops[0].root_zone_water_l_per_m2


def test_presets_of_questions_are_accepted_answers() -> None:
    answers = {"crop": "tomato", "medium": "coir", "area": "100 m2"}
    for each in questions():
        for preset in each.presets(answers):
            each.read(preset.value, answers)


def test_what_is_on_offer_follows_the_answers_before() -> None:
    by_option = {each.option: each for each in questions()}
    assert "fruit-set" in [each.value for each in by_option["stage"].presets({"crop": "tomato"})]
    assert [each.value for each in by_option["stage"].presets({"crop": "sweet-pepper"})] == ["standard", "fruit-set"]
    assert [each.text for each in by_option["medium-volume"].presets({"medium": "peat"})] == ["usual"]


def test_first_steps_name_the_analysis_and_the_water(tmp_path: Path) -> None:
    steps = " ".join(first_steps(new_site_from(tmp_path, NFT)))
    assert "analysis of the tank" in steps
    assert "make-up water" in steps
    assert "fertui round" in steps
    assert "unverified" in steps


def test_a_medium_that_needs_care_says_so(tmp_path: Path) -> None:
    site = new_site(tmp_path, crop="tomato", medium="coir-new", layout="drain-blend", area_m2=1000)
    assert any("coir-new" in each for each in first_steps(site))


def test_the_machine_s_time_zone_is_one_a_site_may_have(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TZ", "Europe/Rome")
    assert machine_timezone() == "Europe/Rome"
    for odd in ("", "/etc/localtime", "CET-1CEST"):
        monkeypatch.setenv("TZ", odd)
        assert machine_timezone()
