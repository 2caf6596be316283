"""site.toml -> Site: what is read, and how each kind of mistake is answered."""

from __future__ import annotations

import pytest

from fertui.refusals import Refusal
from fertui.site.checks import SiteError
from fertui.site.files import parse_site
from fertui.site.model import Site

PLAIN = """
[site]
name = "Elm Lane"
timezone = "Europe/Rome"

[[loops]]
name = "north"
layout = "drain-blend"
area_m2 = 1000
crop = "paprika"
medium = "coco"
stock_tanks = ["calcium", "rest"]
water = "well"

[[waters]]
name = "well"
ions = { Ca = 1.5, HCO3 = 3, Na = 1 }

[[stock_tanks]]
name = "calcium"
litres = 1000
salts_kg = { "calcium nitrate double salt" = 106 }

[[stock_tanks]]
name = "rest"
litres = 1000

[[supplies]]
name = "Saltpetre bag"
kind = "KNO3"
label_pct = { N = 13, K = 38 }

[[supplies]]
name = "Acid"
kind = "nitric acid"
strength_pct = 60

[targets.mine.feed]
EC = 2.4
ions = { K = 8, Ca = 4, NO3 = 16 }
source = "own trial"

[bands.root_zone]
K_share = { low = 20, high = 30, source = "own trial" }

[limits.drain]
Na = { high = 6, source = "permit" }
"""


def site(text: str) -> Site:
    return parse_site(text.encode())


def changed(old: str, new: str) -> str:
    assert old in PLAIN
    return PLAIN.replace(old, new, 1)


def test_a_plain_site_is_read() -> None:
    found = site(PLAIN)
    loop = found.loop("north")
    assert (loop.crop, loop.area_m2, loop.stock_tanks) == ("sweet-pepper", 1000.0, ("calcium", "rest"))
    assert found.waters[0].composition.ions == {"Ca": 1.5, "HCO3": 3.0, "Na": 1.0}
    assert found.supplies[1].strength_pct == 60
    assert found.targets["mine"]["feed"].ec == 2.4
    assert found.bands["root_zone"]["K share"].high == 30
    assert found.limits["drain"]["Na"].source == "permit"
    assert found.scale_step_kg == 0.05


def test_a_file_saved_with_a_byte_order_mark_is_read() -> None:
    assert parse_site(b"\xef\xbb\xbf" + PLAIN.encode()) == site(PLAIN)


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        # unknown key: the nearest known one
        ("area_m2", "area_m22", ["'north'", "area_m2 is missing", "area_m22"]),
        ("water =", "watr =", ["[[loops]] 'north'", "'watr'", "did you mean water?"]),
        ("[[waters]]", "[[water]]", ["'water'", "did you mean waters?"]),
        ("K_share", "K_shar", ["[bands.root_zone]", "did you mean K_share?"]),
        ("[bands.root_zone]", "[bands.rootzone]", ["[bands]", "did you mean root_zone?"]),
        ("strength_pct", "strength", ["'Acid'", "did you mean strength_pct?"]),
        ("Ca = 1.5", "Caa = 1.5", ["'well'", "'Caa'", "did you mean Ca?"]),
        # wrong type
        ("area_m2 = 1000", 'area_m2 = "1000"', ["area_m2 = '1000'", "a number from 0.01 to 10,000,000 m2"]),
        ("area_m2 = 1000", "area_m2 = true", ["area_m2 = True", "a number"]),
        ('name = "north"', "name = 7", ["name = 7", "a text in quotes"]),
        ('stock_tanks = ["calcium", "rest"]', 'stock_tanks = "calcium"', ["stock_tanks", "a list"]),
        ('stock_tanks = ["calcium", "rest"]', "stock_tanks = [1]", ["stock_tanks", "a text in quotes"]),
        ("ions = { Ca = 1.5, HCO3 = 3, Na = 1 }", "ions = 3", ["ions = 3", "a table"]),
        ("[[loops]]", "[loops]", ["loops", "[[loops]]"]),
        ("[[loops]]", "[loops.bands.feed]\n\n[[loop]]", ["loops", "[[loops]]", "found 'loop': is that meant?"]),
        ("K_share = {", "K_share = 5 #", ["K_share = 5", "a table"]),
        # impossible numbers
        ("area_m2 = 1000", "area_m2 = -1", ["area_m2 = -1", "0.01"]),
        ("area_m2 = 1000", "area_m2 = nan", ["area_m2 = nan"]),
        ("area_m2 = 1000", "area_m2 = inf", ["area_m2 = inf"]),
        ("area_m2 = 1000", "area_m2 = 1e300", ["area_m2 = 1e+300"]),
        ("area_m2 = 1000", f"area_m2 = {'9' * 60}", ["more than 40 digits"]),
        ("litres = 1000", "litres = 0", ["'calcium'", "litres = 0"]),
        ("Na = 1 }", "Na = -1 }", ["'well'", "Na = -1"]),
        ("strength_pct = 60", "strength_pct = 60000", ["'Acid'", "strength_pct"]),
        ("strength_pct = 60", "strength_pct = 99", ["'Acid'", "up to 70 %"]),
        ("low = 20", "low = 40", ["[bands.root_zone.K_share]", "low = 40", "high = 30"]),
        ("low = 20, high = 30, ", "", ["K_share", "low, high or both are missing"]),
        ("high = 30", "high = 130", ["high = 130", "0 to 100"]),
        # missing
        ('timezone = "Europe/Rome"', "", ["[site]", "timezone is missing"]),
        ('layout = "drain-blend"', "", ["'north'", "layout is missing"]),
        (', source = "own trial" }', " }", ["[bands.root_zone.K_share]", "source is missing"]),
        ('source = "permit"', 'source = " "', ["[limits.drain.Na]", "say where it comes from"]),
        ('source = "own trial"', 'source = ""', ["[targets.mine.feed]", "say where it comes from"]),
        ("strength_pct = 60", "", ["'Acid'", "strength_pct", "mass % on its label"]),
        # references
        ('medium = "coco"', 'medium = "wool"', ["medium = 'wool'", "stone-wool"]),
        ('crop = "paprika"', 'crop = "tomatoe"', ["crop = 'tomatoe'", "tomato"]),
        ('layout = "drain-blend"', 'layout = "drain blend"', ["drain-blend", "shared-tank", "known-feed"]),
        ('water = "well"', 'water = "wel"', ["water = 'wel'", "did you mean well?"]),
        ('["calcium", "rest"]', '["calcium", "rst"]', ["'rst'", "did you mean rest?"]),
        ('timezone = "Europe/Rome"', 'timezone = "Europe/Rom"', ["did you mean Europe/Rome?"]),
        ('timezone = "Europe/Rome"', 'timezone = "../../etc/passwd"', ["timezone"]),
        ('medium = "coco"', 'medium = "coco"\nstage = "blossom"', ["stage = 'blossom'", "fruit-set"]),
        ('medium = "coco"', 'medium = "coco"\ntarget = "min"', ["target = 'min'", "did you mean mine?"]),
        ('"calcium nitrate double salt" = 106', '"calcium nitrate" = 106', ["'calcium'", "which one?"]),
        ('kind = "KNO3"', 'kind = "calcium nitrate"', ["'Saltpetre bag'", "double salt", "tetrahydrate"]),
        ("label_pct = { N = 13, K = 38 }", "label_pct = { N = 1, K = 38 }", ["'Saltpetre bag'", "does not balance"]),
        ('layout = "drain-blend"', 'layout = "shared-tank"', ["tank_l", "litres of its tank"]),
        ('water = "well"', "drain_share = 0.3\npremix_EC = 0.8", ["premix_EC", "not both"]),
        # names and texts
        ('name = "rest"', 'name = "calcium"', ["[[stock_tanks]]", "'calcium'", "must differ"]),
        ('name = "north"', 'name = ""', ["name = ''", "1 to 60"]),
        ('name = "north"', 'name = " north"', ["1 to 60"]),
        ('name = "north"', f'name = "{"n" * 10_000}"', ["10000 characters", "at most 300"]),
        ('name = "north"', r'name = "a\u0007b"', ["control characters"]),
        ('source = "permit"', r'source = "line\nbreak"', ["line breaks"]),
        ("[[loops]]", 'staffed_days = ["Mo"]\n[[loops]]', ["Mon, Tue"]),
    ],
)
def test_a_mistake_is_named_with_its_place_and_what_is_allowed(old: str, new: str, says: list[str]) -> None:
    with pytest.raises(SiteError) as refused:
        site(changed(old, new))
    said = str(refused.value)
    assert said.startswith("site.toml")
    for each in says:
        assert each in said, said
    assert len(said) < 900
    assert "\n" not in said


def test_a_refusal_is_a_refusal_of_the_program() -> None:
    assert issubclass(SiteError, Refusal)


@pytest.mark.parametrize(
    ("raw", "says"),
    [
        (b"", "name is missing"),
        (b"[site]\nname='x'\ntimezone='UTC'\n", "no loop"),
        (b"[site\n", "not valid TOML"),
        (b"\xff\xfe\x00", "not UTF-8"),
        (b"a = 1\nb = \xff\n", "line 2"),
        (b"a = " + b"[" * 5000, "site.toml"),
        (b"\x00" * 100, "not valid TOML"),
    ],
)
def test_files_that_are_no_site(raw: bytes, says: str) -> None:
    with pytest.raises(SiteError, match=says):
        parse_site(raw)


def test_k_share_may_be_written_either_way_but_not_twice() -> None:
    spaced = PLAIN.replace("K_share =", '"K share" =')
    assert site(spaced) == site(PLAIN)
    doubled = PLAIN.replace("K_share =", '"K share" = { low = 1, source = "x" }\nK_share =')
    with pytest.raises(SiteError, match="given twice"):
        site(doubled)


def test_too_many_tables_are_refused() -> None:
    many = PLAIN + "".join(f'\n[[waters]]\nname = "w{n}"\n' for n in range(300))
    with pytest.raises(SiteError, match="at most 200"):
        site(many)


def test_a_loop_that_names_no_water_is_topped_up_with_the_first_of_the_site() -> None:
    loop = '[[loops]]\nname = "a"\nlayout = "known-feed"\narea_m2 = 10\ncrop = "tomato"\nmedium = "coir"\n'
    head, waters = '[site]\nname = "x"\ntimezone = "UTC"\n', '[[waters]]\nname = "well"\n[[waters]]\nname = "rain"\n'
    assert parse_site((head + loop + waters).encode()).loop().water == "well"
    assert parse_site((head + loop + 'water = "rain"\n' + waters).encode()).loop().water == "rain"
