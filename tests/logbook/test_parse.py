"""Values as people write them become entries; what cannot be is refused with a sentence that helps."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import pytest

from fertui.logbook.errors import LogbookError
from fertui.logbook.kinds import KINDS, Kind
from fertui.logbook.parse import corrected, entry_from_text
from fertui.logbook.store import Logbook
from fertui.logbook.times import read_moment
from fertui.refusals import Refusal
from tests.logbook.conftest import NOW, SITE, Say


def test_a_morning_round_keeps_text_unit_species_and_canonical_number(say: Say) -> None:
    entry = say("reading", K="8,0", NO3__N="120 mg/L", EC="2,6", at="07:30", point="root zone")
    assert entry.at == datetime(2026, 7, 1, 5, 30, tzinfo=UTC)
    assert (entry.point, entry.number_of("K"), entry.text_of("K")) == ("root_zone", 8.0, "8,0")
    nitrate = entry.value("NO3")
    assert nitrate is not None
    assert (nitrate.text, nitrate.unit, nitrate.species) == ("120 mg/L", "mg/L", "NO3-N")
    # 120 / 14.007: standard atomic weight of nitrogen, CIAAW 2021
    assert nitrate.number == pytest.approx(8.567, abs=5e-4)


def test_below_detection_keeps_the_limit_and_says_so(say: Say) -> None:
    value = say("reading", point="feed", NH4="<0,1").value("NH4")
    assert value is not None
    assert (value.number, value.below) == (0.1, True)


@pytest.mark.parametrize(
    ("kind", "texts", "says"),
    [
        ("reading", {"K": "280"}, "Was it mg/L"),
        ("reading", {"EC": "260"}, "10^-5 S/cm (2.6 mS/cm)"),
        ("reading", {"EC": "1800 ppm"}, "mS/cm"),
        ("reading", {"pH": "59"}, "0 to 14"),
        ("reading", {"K": "-1"}, "negative"),
        ("reading", {"K": "nan"}, "number"),
        ("reading", {"K": "inf"}, "number"),
        ("reading", {"Kx": "2"}, "did you mean 'K'"),
        ("reading", {"N": "2"}, "nitrate or ammonium"),
        ("reading", {"NO3": "8", "NO3-N": "300 mg/L"}, "given twice"),
        ("reading", {"EC": "2", "point": "tank"}, "no point of a drain-blend loop"),
        ("reading", {"EC": "2", "point": "rot_zone"}, "did you mean 'root_zone'"),
        ("reading", {"EC": "2", "at": "2027-01-01"}, "future"),
        ("reading", {"EC": "2", "at": "soon"}, "not a time"),
        ("reading", {"EC": "2", "by": " "}, "by is missing"),
        ("reading", {"EC": "2", "by": "M" * 41}, "1 to 40 letters, digits"),
        ("reading", {"EC": "2", "by": "-"}, "1 to 40 letters, digits"),
        ("reading", {"EC": "2", "note": "a\x1b[31mb"}, "not text"),
        ("reading", {}, "at least one of"),
        ("readin", {"EC": "2"}, "did you mean 'reading'"),
        ("analysis", {"K": "8"}, "where was the sample taken"),
        ("dose", {"salt": "MKP"}, "needs kg"),
        ("dose", {"salt": "calcium nitrate", "kg": "1"}, "which one?"),
        ("stock", {"tank": "C", "litres": "3"}, "not known here"),
        ("water", {"make_up": "3 L/m2"}, "L of the whole loop"),
        ("water", {"make_up": "3", "source": "pond"}, "Known: well, rain"),
        ("bleed", {"litres": "200", "reason": "x", "from": "river"}, "Known: tank, drain, drain_store"),
        ("acid", {"acid": "phosphoric acid", "litres": "1"}, "needs strength"),
        ("setpoint", {"drain_share": "30"}, "0 to 1"),
        ("reading", {"EC": "abc"}, "EC: 'abc' does not begin with a number"),
        ("water", {"make_up": "-4"}, "make_up: '-4' is negative"),
        ("reading", {"EC": "2", "at": "28.13.2025 17:00"}, "is not a time; write"),
        ("reading", {"EC": "2", "at": "3/4/2026"}, "is not a time; write"),
        ("plan", {"K": "7", "until": "2026-06-01"}, "not after"),
        ("reading", {"EC": "2", "instrument": "blue pen"}, "temperature="),
        ("analysis", {"K": "8", "point": "root_zone", "method": "extract_1_1.5"}, "is an extract, not pore water"),
    ],
)
def test_refusals_say_what_is_wrong_and_what_to_do(kind: str, texts: dict[str, str], says: str) -> None:
    with pytest.raises(Refusal) as refused:
        entry_from_text(kind, {"by": "MK", **texts}, SITE, "bay", NOW)
    assert says.lower().replace("of the whole loop", "") in str(refused.value).lower()
    assert len(str(refused.value)) > 20


def test_the_house_fills_in_what_it_knows(say: Say) -> None:
    assert say("bleed", litres="2 m3", reason="renewal").text_of("from") == "drain_store"
    assert say("bleed", "gutters", litres="200", reason="renewal").text_of("from") == "tank"
    acid = say("acid", acid="nitric acid", litres="1,5", cautions="acknowledged")
    assert (acid.text_of("acid"), acid.number_of("strength")) == ("nitric 38", 38.0)
    assert say("stock", tank="A", litres="12").text_of("tank") == "calcium"
    assert say("dose", "gutters", salt="monopotassium phosphate", kg="500 g").text_of("salt") == "MKP"
    assert say("analysis", "gutters", K="5").point == "tank"


def test_a_batch_takes_its_salts_by_name(say: Say) -> None:
    batch = say("batch", tank="B", litres="1000", MKP="12,5", left="0", recipe="summer")
    assert batch.number_of("MKP") == 12.5
    with pytest.raises(Refusal):
        say("batch", tank="B", litres="1000", sawdust="3")


def test_amounts_without_a_time_cover_the_local_day_and_samples_stand_at_noon(say: Say) -> None:
    water, sample = (
        say("water", make_up="900", at="2026-06-30"),
        say("analysis", point="feed", K="7", at="2026-06-30"),
    )
    assert (water.at, water.whole_day) == (datetime(2026, 6, 29, 22, 0, tzinfo=UTC), True)
    assert (sample.at, sample.whole_day) == (datetime(2026, 6, 30, 10, 0, tzinfo=UTC), True)
    early = say("reading", point="feed", EC="2", at="today", now=datetime(2026, 7, 1, 5, 0, tzinfo=UTC))
    assert early.at == datetime(2026, 7, 1, 5, 0, tzinfo=UTC)


@pytest.mark.parametrize(
    ("written", "utc"),
    [
        ("28.6.2026 17:00", "2026-06-28T15:00"),
        ("28.06.2026 7.05", "2026-06-28T05:05"),
        ("2026-06-28 7:05", "2026-06-28T05:05"),
        ("2026-06-28T07:05", "2026-06-28T05:05"),
        ("yesterday 8:00", "2026-06-30T06:00"),
        ("1.7.2026", "2026-06-30T22:00"),
    ],
)
def test_times_as_people_write_them(written: str, utc: str) -> None:
    # Europe/Amsterdam is two hours ahead of UTC in summer (IANA time zone database)
    moment, whole = read_moment(written, "Europe/Amsterdam", datetime(2026, 7, 1, 9, tzinfo=UTC))
    assert f"{moment:%Y-%m-%dT%H:%M}" == utc
    assert whole == (written == "1.7.2026")


def test_clock_changes_are_never_guessed() -> None:
    # Europe/Amsterdam: forward 29 March 2026 at 02:00, back 25 October 2026 at 03:00 (EU directive 2000/84/EC)
    now = datetime(2026, 12, 1, tzinfo=UTC)
    with pytest.raises(LogbookError, match="never was"):
        read_moment("2026-03-29 02:30", "Europe/Amsterdam", now)
    with pytest.raises(LogbookError, match="was twice"):
        read_moment("2026-10-25 02:30", "Europe/Amsterdam", now)
    told, _ = read_moment("2026-10-25T02:30+01:00", "Europe/Amsterdam", now)
    assert told == datetime(2026, 10, 25, 1, 30, tzinfo=UTC)
    day, whole = read_moment("2026-10-25", "Europe/Amsterdam", now)
    following, _ = read_moment("2026-10-26", "Europe/Amsterdam", now)
    assert (whole, following - day) == (True, timedelta(hours=25))


def test_ec_of_a_meter_that_does_not_compensate_is_brought_to_25_degrees(say: Say) -> None:
    entry = say("reading", point="feed", EC="2,60", temperature="15", instrument="blue pen")
    value = entry.value("EC")
    assert value is not None
    # 2.60 x 1.256: ISO 7888:1985 factor at 15 C is 1.256 to 25 C
    assert value.number == pytest.approx(2.60 * 1.256, abs=0.005)
    assert (value.text, value.unit) == ("2,60", "mS/cm at 15 C")


def test_an_extract_with_a_factor_or_marked_doubtful_is_kept(say: Say) -> None:
    assert say("analysis", point="root_zone", method="paste", K="3").method == "paste"
    assert (
        say("analysis", point="root_zone", method="pour-through", K="3", doubtful="no factor").method == "pour_through"
    )


def test_a_correction_keeps_what_it_does_not_name(book: Logbook, say: Say) -> None:
    (number,) = book.append(say("reading", point="feed", K="8", Ca="51", EC="2.6", note="hot"))
    fixed = corrected(book.entry(number), {"Ca": "5,1", "EC": ""}, SITE, NOW, why="digit", by="AB")
    assert [(value.name, value.number) for value in fixed.values] == [("K", 8.0), ("Ca", 5.1)]
    assert (fixed.supersedes, fixed.by, fixed.why, fixed.note) == (number, "AB", "digit", "hot")
    moved = corrected(book.entry(number), {"at": "06:00"}, SITE, NOW, why="time", by="AB")
    assert moved.at == datetime(2026, 7, 1, 4, 0, tzinfo=UTC)


@pytest.mark.parametrize(
    ("changes", "why"), [({"Ca": "6"}, " "), ({}, "typo"), ({"Q": "6"}, "typo"), ({"K": "", "Ca": ""}, "x")]
)
def test_a_correction_without_reason_or_substance_is_refused(
    book: Logbook, say: Say, changes: dict[str, str], why: str
) -> None:
    (number,) = book.append(say("reading", point="feed", K="8", Ca="51"))
    with pytest.raises(Refusal):
        corrected(book.entry(number), changes, SITE, NOW, why=why, by="AB")


def test_a_half_filled_form_may_lack_what_an_entry_needs() -> None:
    assert entry_from_text("dose", {"salt": "MKP"}, SITE, "gutters", NOW, whole=False).by == ""


@pytest.mark.parametrize("kind", KINDS.values(), ids=lambda kind: kind.name)
def test_every_kind_can_be_recorded_with_its_required_fields(kind: Kind, book: Logbook) -> None:
    words = {"tank": "calcium", "salt": "MKP", "acid": "nitric 38", "word": "", "text": "a = 1\n", "name": "heat"}
    texts = {
        field.name: field.words[0] if field.words else words.get(field.what, "7")
        for field in kind.fields
        if field.required
    }
    first = next(field for field in kind.fields)
    texts = texts or {first.name: first.words[0] if first.words else words.get(first.what, "7")}
    entry = entry_from_text(kind.name, {"by": "MK", "point": "feed", **texts}, SITE, "bay", NOW)
    (number,) = book.append(entry)
    assert {value.name for value in book.entry(number).values} >= set(texts)
