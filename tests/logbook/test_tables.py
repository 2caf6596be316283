"""Tables in and out: what laboratories and growers really write, each conversion shown, nothing twice, nothing run."""

from __future__ import annotations

import csv
import random
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from fertui.logbook.entries import Entry
from fertui.logbook.errors import LogbookError
from fertui.logbook.exporting import export
from fertui.logbook.importing import ImportResult, import_table
from fertui.logbook.parse import corrected
from fertui.logbook.store import Logbook
from fertui.logbook.templates import Template, read_template, save_template
from fertui.refusals import Refusal
from tests.logbook.conftest import NOW, SITE, Say

Import = Callable[..., ImportResult]


@pytest.fixture
def take(book: Logbook, tmp_path: Path) -> Import:
    """Import a text as a table of a kind."""

    def imported(text: str | bytes, kind: str = "analysis", **wishes: Any) -> ImportResult:
        path = tmp_path / "table.csv"
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return import_table(path, kind, book, SITE, NOW, **{"by": "MK", **wishes})

    return imported


def numbers(result: ImportResult, row: int = 0) -> dict[str, float | None]:
    """Numbers of one row by name."""
    return {value.name: value.number for value in result.rows[row].entry.values}


LAB_SHEET = """\
Date;Sample point;NO3-N;NH4-N;P2O5;K2O;Ca;Mg;S;Alkalinity;EC;Remark
;;mg/L;mg/L;mg/L;mg/L;mg/L;mg/L;mg/L;mg/L CaCO3;10^-5 S/cm;
15.06.2026;drip;168;7;90;300;170;36;48;120;260;first
15.06.2026;drain;210,5;<1;62,5;240,9;250;61;96;30;310;
22.06.2026;drip;165;6,5;88;295;172;35;47;110;255;
"""


def test_a_lab_sheet_gives_what_a_chemist_gets_by_hand(take: Import) -> None:
    result = take(LAB_SHEET)
    got = numbers(result)
    # By hand with CIAAW 2021 standard atomic weights: N 14.007, P 30.974, K 39.098, Ca 40.078, Mg 24.305, S 32.06,
    # O 15.999: P2O5 141.94 g per 2 mol, K2O 94.195 g per 2 mol; CaCO3 100.09 g per 2 eq of alkalinity.
    hand = {
        "NO3": 168 / 14.007, "NH4": 7 / 14.007, "H2PO4": 90 * 2 / 141.94, "K": 300 * 2 / 94.195, "Ca": 170 / 40.078,
        "Mg": 36 / 24.305, "SO4": 48 / 32.06, "HCO3": 120 * 2 / 100.09, "EC": 2.60,
    }  # fmt: skip
    assert got == pytest.approx(hand, rel=2e-4)
    # The same sheet in practice's own words: SS 260 is 2.60 mS/cm, 120 ppm CaCO3 2.40 meq/L, P2O5 90 is P 39 mg/L,
    # K2O 300 is K 249 mg/L (North Carolina solution report form and fertiliser factors 2.29, 1.20)
    assert got["HCO3"] == pytest.approx(2.40, abs=0.005)
    assert (got["H2PO4"] or 0) * 30.974 == pytest.approx(39, abs=0.5)
    assert (got["K"] or 0) * 39.098 == pytest.approx(249, abs=0.5)
    assert [row.entry.point for row in result.rows] == ["feed", "drain", "feed"]
    assert [f"{row.entry.at:%d %b}" for row in result.rows] == ["15 Jun", "15 Jun", "22 Jun"]
    second = result.rows[1].entry
    assert second.number_of("NO3") == pytest.approx(210.5 / 14.007, rel=2e-4)
    ammonium = second.value("NH4")
    assert ammonium is not None
    assert ammonium.below
    assert result.rows[0].entry.note == "first"


def test_a_dry_run_shows_every_conversion_and_check_and_writes_nothing(take: Import, book: Logbook) -> None:
    result = take(LAB_SHEET, dry_run=True)
    assert book.last_number() == 0
    words = "\n".join(result.words())
    assert "NO3-N in mg/L, as NO3" in words
    assert "H2PO4: 90 mg/L P2O5 = 1.268 mmol/L" in words
    assert "HCO3: 120 mg/L CaCO3 = 2.398 meq/L" in words
    assert "EC: 260 10^-5 S/cm = 2.6 mS/cm" in words
    assert "3 analysis entries would be added (dry run, nothing written), already there: 0." in words
    assert "line 3: new, Mon 15 Jun 2026 12:00 (no hour given) feed" in words


def test_nitrate_given_as_ion_where_nitrogen_was_meant_is_asked_about(take: Import) -> None:
    # The sheet above with NO3-N read as NO3: 168 mg/L of the ion is 2.7 mmol/L, the anions are gone
    wrong = take(LAB_SHEET.replace("NO3-N", "NO3"), dry_run=True).rows[0]
    codes = {question.code for question in wrong.questions}
    assert codes >= {"charge_balance", "ec_check"}
    assert "NO3" in wrong.questions[0].suggestion
    assert "NO3-N" in wrong.questions[0].text


def test_a_repeated_import_adds_nothing_even_after_a_correction(take: Import, book: Logbook) -> None:
    take(LAB_SHEET)
    assert (take(LAB_SHEET).count("new"), take(LAB_SHEET).count("there"), book.last_number()) == (0, 3, 3)
    book.append(corrected(book.entry(1), {"K": "6.2"}, SITE, NOW, why="digit", by="MK"))
    book.void(2, "wrong sample", "MK")
    assert take(LAB_SHEET).count("there") == 3
    later = take(LAB_SHEET + "29.06.2026;drip;165;6,5;88;295;172;35;47;110;255;\n")
    assert (later.count("new"), later.count("there"), len(later.written)) == (1, 3, 1)


def test_a_sample_that_is_there_with_other_numbers_is_shown_and_left_out(take: Import, book: Logbook) -> None:
    take(LAB_SHEET)
    result = take(LAB_SHEET.replace("168;", "178;"))
    assert [(row.state, row.existing) for row in result.rows] == [("differs", 1), ("there", 2), ("there", 3)]
    assert book.last_number() == 3
    assert result.words()[-1].endswith("left out: 1 (fertui supersede).")
    assert "line 3: differs from entry 1 and is left out, Mon 15 Jun" in "\n".join(result.words())


def test_two_equal_rows_of_one_table_are_two_events(take: Import, book: Logbook) -> None:
    table = "at,salt,kg [kg]\n2026-06-20,MKP,0.5\n2026-06-20,MKP,0.5\n"
    assert len(take(table, "dose", loop="gutters").written) == 2
    assert len(take(table, "dose", loop="gutters").written) == 0


def test_times_are_told_on_the_clock_of_the_site(take: Import) -> None:
    # Amsterdam is two hours ahead of UTC in June (IANA time zone database)
    result = take("at,point,K [mg/L]\n2026-06-20 11:00,drain,280\n20.06.2026 7:30,feed,280\n")
    assert [row.when for row in result.rows] == ["Sat 20 Jun 2026 11:00", "Sat 20 Jun 2026 07:30"]
    assert [f"{row.entry.at:%H:%M}" for row in result.rows] == ["09:00", "05:30"]
    assert result.words()[-1] == "2 analysis entries added, already there: 0."
    amounts = take("at,make_up [L]\n2026-06-20,2400\n", "water")
    assert amounts.rows[0].when == "Sat 20 Jun 2026, the whole day"
    assert amounts.words()[-1] == "1 water entry added, already there: 0."


def test_a_unit_that_the_head_does_not_give_is_said(take: Import) -> None:
    words = take("at,point,K,Fe,pH,Ca [mg/L]\n2026-06-20,drain,7.1,30,5.6,280\n", dry_run=True).words()
    assert "column K: K, no unit given: taken as mmol/L" in words
    assert "column Fe: Fe, no unit given: taken as umol/L" in words
    assert "column pH: pH" in words
    assert "column Ca [mg/L]: Ca in mg/L" in words


@pytest.mark.parametrize(
    ("table", "says"),
    [
        ("at,point,K\n2026-06-20,drain\n", "line 2: no row has a value"),
        ("at,point,K\n2026-06-20,drain,7,8\n", "column 4, in which line 2 has a cell"),
        ("at,point,K [mmol/kg]\n2026-06-20,drain,7\n", r"column 'K \[mmol/kg\]': 'mmol/kg' is not a unit"),
        ("at,point,K,pH\n2026-06-20,drain,7,29\n", "line 2: pH: pH 29 cannot be"),
        ("at,point,Kalium\n2026-06-20,drain,7\n", r'templates/NAME.toml .*columns = \{ "Kalium" = "K \[mg/L\]" \}'),
    ],
)
def test_a_refusal_names_the_column_or_line(take: Import, table: str, says: str) -> None:
    with pytest.raises(Refusal, match=says):
        take(table)


SHAPES = {
    "tabs": "date\tpoint\tK [mg/L]\tpH\n2026-06-20\tdrain\t280\t5.6\n",
    "pipes": "date|point|K [mg/L]|pH\n2026-06-20|drain|280|5.6\n",
    "decimal comma": "date;point;K [mg/L];pH\n2026-06-20;drain;280,0;5,6\n",
    "quoted commas": 'date,point,K [mg/L],pH\n2026-06-20,drain,"280,0","5,6"\n',
    "thousands": "date;point;K [ug/L];pH\n2026-06-20;drain;280.000,0;5,6\n",
    "units below": "date,point,K,pH\n,,mg/L,\n2026-06-20,drain,280,5.6\n",
    "title above": "Test laboratory\n\nClient,12\ndate,point,K [mg/L],pH\n2026-06-20,drain,280,5.6\n",
    "units behind": "date,point,K_mg_L,pH\n2026-06-20,drain,280,5.6\n",
    "byte-order mark": "\ufeffdate,point,potassium [mg/L],pH\n2026-06-20,drain,280,5.6\n",
    "samples across": "date;unit;2026-06-20\nK;mg/L;280\npH;;5,6\npoint;;drain\n",
    "one result a row": "date,point,parameter,unit,result\n2026-06-20,drain,K,mg/L,280\n2026-06-20,drain,pH,,5.6\n",
    "american dates": "date,point,K [ppm],pH\n06/20/2026,drain,280,5.6\n",
    "european dates": "date,time,point,K [ppm],pH\n20-6-2026,12:00,drain,280,5.6\n",
}


@pytest.mark.parametrize("shape", SHAPES)
def test_tables_of_many_shapes_say_the_same(take: Import, shape: str) -> None:
    result = take(SHAPES[shape])
    # 280 mg/L K is 7.16 mmol/L (39.098 g/mol, CIAAW 2021)
    assert numbers(result) == pytest.approx({"K": 280 / 39.098, "pH": 5.6}, rel=1e-4)
    entry = result.rows[0].entry
    assert (entry.point, f"{entry.at:%Y-%m-%d %H:%M}") == ("drain", "2026-06-20 10:00")


def test_units_of_every_column_are_its_own(take: Import) -> None:
    table = "at,point,Ca [meq/L],Mg [mmol/L],B [mg/L],Fe [umol/L],NO3 [ppm N]\n2026-06-20,feed,8,2,0.3,20,140\n"
    got = numbers(take(table))
    # Ca 2 eq/mol; B 10.81, N 14.007 g/mol (CIAAW 2021)
    assert got == pytest.approx({"Ca": 4.0, "Mg": 2.0, "B": 300 / 10.81, "Fe": 20.0, "NO3": 140 / 14.007}, rel=1e-4)


@pytest.mark.parametrize(
    ("table", "says"),
    [
        ("", "empty"),
        ("date,K\n", "no rows"),
        ("date,point,K\n01/02/2026,drain,8\n", "day/month or month/day"),
        ("date,point,Kalium\n2026-06-20,drain,8\n", "'Kalium'"),
        ("point,K\ndrain,8\n", "no column says when"),
        ("date,point,K,K [mg/L]\n2026-06-20,drain,8,8\n", "keep one"),
        ("date,point,K\n2026-06-20,drain,eight\n", "line 2"),
        ("date,point,K\n2026-06-20,drain,8\n2026-06-21,moon,8\n", "line 3"),
        ("date,point,K\n2027-06-20,drain,8\n", "future"),
        ("date,point,K\n,drain,8\n", "does not say when"),
        ("date,point,K\n2026-06-20,drain,\n", "no row has a value"),
        ("date,point,K [mg/L],NO3 [mg/L],NO3-N [mg/L]\n2026-06-20,drain,8,700,50\n", "given twice"),
        ("date,point,EC [ppm]\n2026-06-20,drain,1800\n", "total strength"),
        (b"PK\x03\x04\x00\x00\x00binary\x00\x01", "not a text table"),
    ],
)
def test_a_table_that_cannot_be_taken_changes_nothing(
    take: Import, book: Logbook, table: str | bytes, says: str
) -> None:
    with pytest.raises(Refusal, match=says):
        take(table)
    assert book.last_number() == 0


def test_nitrate_and_its_nitrogen_side_by_side_may_agree(take: Import) -> None:
    got = numbers(take("date,point,NO3 [mg/L],NO3-N [mg/L]\n2026-06-20,drain,620,140\n"))
    assert got == pytest.approx({"NO3": 10.0}, rel=1e-3)


def test_a_template_is_kept_for_each_laboratory(take: Import, tmp_path: Path) -> None:
    template = Template(
        columns={"Kalium": "K [mg/L]", "Datum": "at", "Punt": "point"},
        points={"druppel": "feed"},
        ignore=("Klant",),
        blank=("n.b.",),
        dates="dmy",
        values={"lab": "Testlab"},
    )
    save_template(tmp_path, "Testlab", template)
    assert read_template(tmp_path, "Testlab") == template
    table = "Datum;Klant;Punt;Kalium;pH\n01/02/2026;12;druppel;280;n.b.\n"
    entry = take(table, template=read_template(tmp_path, "Testlab")).rows[0].entry
    assert (entry.point, f"{entry.at:%d %b}", entry.text_of("lab")) == ("feed", "01 Feb", "Testlab")
    assert entry.value("pH") is None


@pytest.mark.parametrize("name", ["../../etc/x", "", "a/b", ".hidden", "x" * 99, "a\x00b"])
def test_a_template_name_never_leaves_its_folder(tmp_path: Path, name: str) -> None:
    with pytest.raises(LogbookError):
        save_template(tmp_path, name, Template())
    with pytest.raises(LogbookError):
        read_template(tmp_path, name)
    assert list(tmp_path.iterdir()) == []


def test_a_template_with_an_unknown_key_names_the_nearest(tmp_path: Path) -> None:
    path = save_template(tmp_path, "lab", Template())
    path.write_text('collumns = {a = "b"}\n')
    with pytest.raises(LogbookError, match="did you mean 'columns'"):
        read_template(tmp_path, "lab")


def test_a_point_named_by_its_water_is_a_source_sample(take: Import) -> None:
    entry = take("date,location,Na [mg/L]\n2026-06-20,Well,46\n").rows[0].entry
    assert (entry.point, entry.text_of("source")) == ("source", "well")


def test_export_and_import_round_trip_every_value(book: Logbook, say: Say, tmp_path: Path) -> None:
    draw = random.Random(7)
    book.append([
        say("analysis", point="drain", at="2026-06-20", K="<0,1", P2O5="90 mg/L", Fe="1 mg/L", alkalinity="-0.3 meq/L"),
        say("reading", point="feed", at="2026-06-20 07:31", EC=repr(draw.uniform(1, 4)), K=repr(draw.uniform(1, 9)),
            light_sum="12.5 MJ/m2", drain_pct="31,4"),
        say("water", at="2026-06-20", make_up=repr(draw.uniform(0, 9e4)), source="well", make_up_meter="912.25 m3"),
        say("batch", tank="A", litres="1000", MKP="12.345 kg", left="0", note="=cmd|'/C calc'!A0"),
        say("setpoint", EC="2.6", drain_share="30 %"),
        say("plan", K="7", until="2026-08-01", irrigation="4 m3/d"),
        say("acid", "gutters", acid="nitric 38", litres="350 mL", cautions="acknowledged"),
        say("note", text="'=not a formula, \"quoted\", \u00e9"),
        say("crop", event="planted", note="-2 rows\nnext line"),
    ])  # fmt: skip
    paths = export(book, tmp_path / "out", SITE.timezone)
    with Logbook.create(tmp_path / "second.sqlite3") as second:
        for path in paths:
            import_table(path, path.stem, second, SITE, NOW, by="XX")
        for one in book.entries():
            (other,) = (each for each in second.entries() if (each.kind, each.loop) == (one.kind, one.loop))
            assert (other.at, other.by, other.point, other.note) == (one.at, one.by, one.point, one.note)
            assert (other.whole_day, measured(other), words(other)) == (one.whole_day, measured(one), words(one))


def measured(entry: Entry) -> list[tuple[str, float, bool]]:
    """Names, numbers and below-marks of an entry."""
    return sorted((value.name, value.number, value.below) for value in entry.values if value.number is not None)


def words(entry: Entry) -> dict[str, str]:
    """Words of an entry by name."""
    return {value.name: value.text for value in entry.values if value.number is None}


def test_no_exported_cell_is_run_by_a_spreadsheet(book: Logbook, say: Say, tmp_path: Path) -> None:
    for start in "=+-@":
        book.append(say("note", text=f"{start}1+1", note=f"{start}HYPERLINK(1)"))
    (path,) = export(book, tmp_path / "out", SITE.timezone)
    with path.open(newline="") as file:
        cells = [cell for row in csv.reader(file) for cell in row]
    assert [cell for cell in cells if cell[:1] in tuple("=+-@\t\r")] == []


def test_the_measured_houses_go_in_by_new_heads_alone(house_folder: Path, take: Import) -> None:
    def head(name: str) -> str:
        for ending, unit in (("_mmol_L", "mmol/L"), ("_umol_L", "umol/L"), ("_mS_cm", "mS/cm")):
            if name.endswith(ending):
                return f"{name.removesuffix(ending)} [{unit}]"
        return {"date": "at"}.get(name, name)

    with (house_folder / "rockwool_tomato_analyses.csv").open(newline="") as file:
        rows = list(csv.reader(file))
    house = [row for row in rows[1:] if row[0] == "1"]
    result = take("\n".join(",".join(row[1:]) for row in ([head(name) for name in rows[0]], *house)))
    assert len(result.written) == 20
    assert numbers(result)["Si"] == pytest.approx(90.0)
    assert sum(bool(row.entry.doubtful) for row in result.rows) == sum(bool(row[-1]) for row in house)


def test_how_a_table_was_read_can_be_kept_as_a_template(take: Import, book: Logbook, tmp_path: Path) -> None:
    first = take(LAB_SHEET, dry_run=True)
    save_template(tmp_path, "lab", first.template)
    kept = read_template(tmp_path, "lab")
    assert (kept.columns["P2O5"], kept.dates, kept.decimal, kept.delimiter) == ("P2O5 [mg/L]", "dmy", ",", ";")
    again = take(LAB_SHEET, template=kept, dry_run=True)
    assert [measured(row.entry) for row in again.rows] == [measured(row.entry) for row in first.rows]
    with pytest.raises(LogbookError, match="by its units row"):
        take(LAB_SHEET.replace("mg/L;mg/L CaCO3", "mmol/L;mg/L CaCO3"), template=kept)


def test_the_same_trouble_on_many_lines_is_told_once(take: Import) -> None:
    with pytest.raises(LogbookError, match=r"line 2, 3, 4, 5, 6, 7, 8, 9 and 12 more: point = 'moon'"):
        take("date,point,K\n" + "2026-06-20,moon,8\n" * 20)


def test_a_table_that_names_nobody_is_by_the_import(take: Import) -> None:
    assert take("date,point,K\n2026-06-20,drain,8\n", by="").rows[0].entry.by == "import"


def test_a_sample_called_like_a_point_was_taken_there(take: Import) -> None:
    rows = take("date,sample,K\n2026-06-20,Root zone,8\n2026-06-20,drip,7\n").rows
    assert [(row.entry.point, row.entry.text_of("sample")) for row in rows] == [("root_zone", ""), ("feed", "")]
    with pytest.raises(LogbookError, match="a column point"):
        take("date,sample,K\n2026-06-20,4711,8\n")


def test_rows_unlike_those_before_them_are_asked_about_by_line(take: Import, book: Logbook) -> None:
    readings = "at,point,EC\n2026-06-18 08:00,feed,2.5\n2026-06-19 08:00,feed,2.6\n2026-06-20 08:00,feed,26\n"
    (said,) = [row for row in take(readings, "reading", dry_run=True).rows if row.questions]
    assert (said.line, [each.code for each in said.questions]) == (4, ["out_by_ten"])
    assert said.questions[0].text == "EC 26? The last was 2.6. Out by ten?"
    meter = "at,make_up_meter\n2026-06-18 08:00,52000\n2026-06-19 08:00,54100\n2026-06-20 08:00,45200\n"
    found = take(meter, "water")
    assert [(row.line, row.questions[0].code) for row in found.rows if row.questions] == [(4, "meter_backwards")]
    assert "below the last position, 54100 L (a row before)" in "\n".join(found.words())
    assert found.words()[-2].startswith("look again at line 4 (see ? there)")
    assert [entry.flags for entry in book.entries(kinds=("water",))] == ["", "", "meter_backwards"]
    # the same rows once more are known, and those after them are held against the book
    again = take(meter + "2026-06-21 08:00,56200\n2026-06-21 08:00,56200\n", "water")
    assert [row.state for row in again.rows] == ["there"] * 3 + ["new"] * 2
    assert [[each.code for each in row.questions] for row in again.rows[3:]] == [[], ["duplicate"]]


def test_a_steady_sensor_every_five_minutes_raises_no_question_and_takes_no_time(take: Import) -> None:
    rows = [f"2026-06-{day:02} {hour:02}:{minute:02},feed,2.6" for day in (18, 19, 20) for hour in range(24)
            for minute in range(0, 60, 5)]  # fmt: skip
    found = take("\n".join(["at,point,EC", *rows]), "reading", dry_run=True)
    assert (found.count("new"), [row for row in found.rows if row.questions]) == (864, [])
