"""Forms driven key by key: what an entry costs, what is asked back, that what was typed is in the logbook afterwards.

Key budgets are the project's own: a reading of seven numbers its characters and 9 keys, an analysis of twelve ions its
characters and 16, both without the initials.
"""

from __future__ import annotations

import re
import sqlite3
from contextlib import closing
from pathlib import Path

import pytest
from conftest import Opened
from pseudo_terminal import PseudoTerminal

from fertui.logbook.entries import Entry
from fertui.logbook.errors import LogbookError
from fertui.logbook.kinds import KINDS
from fertui.workbench import open_site


class Counted:
    """Presses keys one by one and counts them: characters of values apart from the other keys."""

    def __init__(self, terminal: PseudoTerminal) -> None:
        self.terminal, self.characters, self.keys = terminal, 0, 0

    def key(self, *names: str) -> None:
        for name in names:
            self.terminal.press(name)
            self.keys += 1

    def value(self, text: str) -> None:
        for character in text:
            self.terminal.press(character)
            self.characters += 1


@pytest.fixture
def site(todays_site: Path) -> Path:
    return todays_site


def fresh(site: Path, kind: str) -> list[Entry]:
    """Entries of a kind that were written since the demo was built."""
    first = int((site.parent / "first_number").read_text())
    return [entry for entry in open_site(site).history(kind=kind) if (entry.number or 0) > first]


@pytest.fixture
def counting(site: Path, open_terminal: Opened) -> Counted:
    (site.parent / "first_number").write_text(str(open_site(site).last_number()))
    shown = open_terminal(site)
    shown.until_text("more to look at")
    shown.settle()
    return Counted(shown)


def give_initials(terminal: PseudoTerminal) -> None:
    terminal.until_text("Your initials:")
    terminal.press("M", "K", "enter")


def test_a_reading_of_seven_numbers(site: Path, counting: Counted) -> None:
    counting.key("r")
    for text in ("2.62", "5.5", "18.6", "2900", "21.5", "21.0"):
        counting.value(text)
        counting.key("enter")
    counting.value("1,1")
    counting.key("+", "+")  # the first one asks about the cautions of the acid
    give_initials(counting.terminal)
    counting.terminal.until_text("saved")
    assert counting.keys <= 9
    [reading] = fresh(site, "reading")
    assert (reading.point, reading.by) == ("feed", "MK")
    assert [reading.number_of(name) for name in ("EC", "pH", "temperature")] == [2.62, 5.5, 18.6]
    assert [entry.number_of("make_up") for entry in fresh(site, "water")] == [2900.0]
    assert {entry.text_of("tank"): entry.number_of("litres") for entry in fresh(site, "stock")} == {
        "calcium": 21.5,
        "sulfate": 21.0,
    }
    [acid] = fresh(site, "acid")
    assert (acid.number_of("litres"), acid.text_of("cautions")) == (1.1, "not acknowledged")


def test_after_the_last_field_of_a_round_comes_the_next_loop_and_after_the_last_loop_today(
    site: Path, counting: Counted
) -> None:
    terminal = counting.terminal
    first, second = open_site(site).loops
    terminal.press("7", "r", "2.6")
    for _ in range(30):
        if "Your initials:" in terminal.text:
            break
        terminal.press("enter")
    terminal.until_text("Your initials:")
    terminal.type(b"MK\r1.92\r5.8")  # typed ahead: it lands in the round of the next loop
    terminal.until_text(f"Reading, {second}")
    terminal.until_text("= 1.92 mS/cm")
    terminal.settle()
    for _ in range(30):
        if f"Reading, {second}" not in terminal.text:
            break
        terminal.press("enter")
    assert "saved" in terminal.until_text("worst first")
    found = [(entry.loop, entry.number_of("EC"), entry.number_of("pH")) for entry in fresh(site, "reading")]
    assert found == [(first, 2.6, None), (second, 1.92, 5.8)]


def test_plus_saves_a_round_and_stays_with_its_loop(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("7", "r", "2.6", "+")
    give_initials(terminal)
    terminal.until_text("saved")
    assert "newest first" in terminal.text


ANALYSIS = {
    "K": "7.8", "Ca": "5.6", "Mg": "2.5", "Na": "1.6", "NH4": "0.4", "NO3": "14.7", "Cl": "1.4", "SO4": "3.7",
    "H2PO4": "1.1",
    "HCO3": "0.4", "Fe": "25", "Mn": "10",
}  # fmt: skip
"""An invented analysis whose charges close."""


def test_an_analysis_of_twelve_ions(site: Path, counting: Counted) -> None:
    counting.key("a", "f", "enter")  # f: the drip, called feed
    counting.key("enter")  # sampled now
    *first, last = ANALYSIS.values()
    for text in first:
        counting.value(text)
        counting.key("enter")
    counting.value(last)
    counting.terminal.until_text("charge balance")
    counting.key("+")
    give_initials(counting.terminal)
    counting.terminal.until_text("saved")
    assert counting.keys <= 16
    [analysis] = fresh(site, "analysis")
    assert analysis.point == "feed"
    assert {value.name: value.number for value in analysis.values} == {
        ion: float(text) for ion, text in ANALYSIS.items()
    }


def test_plan_accepted_and_a_step_marked_done(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("n")
    counting.key("p")
    terminal.until_text("with the plan")
    counting.key("y")
    terminal.until_text("Before any acid is handled")
    counting.key("enter")
    counting.value("38")
    counting.key("enter")
    give_initials(terminal)
    terminal.until_text("logged as")
    counting.key("enter")
    terminal.until_text("done with how much")
    counting.key("enter")
    terminal.until_text("logged as")
    assert counting.keys <= 8
    assert len(fresh(site, "plan")) == 3
    [acid] = fresh(site, "acid")
    assert (acid.number_of("litres"), acid.text_of("cautions")) == (0.42, "acknowledged")


def test_an_accepted_plan_stands_alone_and_is_not_accepted_twice(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("n", "p")
    keys = terminal.until_text("with the plan").splitlines()[-1]
    assert "y accept" in keys
    assert "Enter done" not in keys  # nothing is accepted yet
    terminal.press("y", "enter", "38", "enter")
    give_initials(terminal)
    shown = terminal.until_text("Already planned: these steps stand")
    assert " weigh " not in shown
    assert "with these steps" in shown
    assert "y accept" not in shown.splitlines()[-1]
    terminal.press("y")
    terminal.until_text("Accepted steps stand")
    assert len(fresh(site, "plan")) == 3


def test_a_step_done_in_part_says_what_is_left_and_asks_for_that(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("n", "p")
    terminal.until_text("with the plan")
    terminal.press("y", "enter", "38", "enter")
    give_initials(terminal)
    terminal.until_text("logged as")
    terminal.press("enter")
    terminal.until_text("done with how much, L? 0.42")
    terminal.press("0.2", "enter")
    assert "! 0.2 of 0.42 L done" in terminal.until_text("0.2 of 0.42")
    terminal.press("enter")
    terminal.until_text("done with how much more, L? 0.22")
    terminal.press("enter")
    terminal.until_text("✓ done in")
    assert [entry.number_of("litres") for entry in fresh(site, "acid")] == [0.2, 0.22]


def test_a_plan_with_acid_is_held_back_until_the_label_fits(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("n", "p")
    assert "0.42 L" not in terminal.until_text("What holds acid is held back")
    terminal.press("y")
    terminal.until_text("Before any acid is handled")
    terminal.press("enter", "6", "0", "enter")
    assert "nothing is released" in terminal.until_text("Not released")
    terminal.press("esc")
    terminal.until_text("What holds acid is held back")
    assert fresh(site, "plan") == []


@pytest.mark.parametrize(
    ("typed", "asked"),
    [("280", "280"), ("26", "26"), ("-1", "-1"), ("nan", "A number goes here"), ("2.6 mS/m2", "mS/m2"), ("59", "59")],
)
def test_a_value_that_cannot_be_or_is_out_by_ten_is_asked_about_at_once(
    counting: Counted, typed: str, asked: str
) -> None:
    terminal = counting.terminal
    terminal.press("r", typed, "enter")
    terminal.settle()
    rows = terminal.text.splitlines()
    assert any(asked in row for row in rows[-6:]), terminal.text
    assert "▸ EC" in terminal.text  # the cursor has not left the field


def test_a_comma_is_a_decimal_mark_and_the_value_is_echoed_with_its_unit(counting: Counted) -> None:
    counting.terminal.press("r", "2,6", "enter")
    counting.terminal.until_text("= 2.6 mS/cm")


def test_keys_typed_ahead_of_a_slow_line_land_in_their_fields(counting: Counted) -> None:
    counting.terminal.type(b"r2.61\r5.4\r18.2\r")
    text = counting.terminal.until_text("= 18.2 C")
    assert "2.61______" in text
    assert "5.4_______" in text


def test_keys_pressed_before_the_site_is_open_wait_for_it(site: Path, open_terminal: Opened) -> None:
    with closing(sqlite3.connect(site / "logbook.sqlite3", isolation_level=None)) as other:
        other.execute("PRAGMA locking_mode = EXCLUSIVE")
        other.execute("BEGIN EXCLUSIVE")
        terminal = open_terminal(site)
        terminal.until_text("Today")
        terminal.settle()
        assert "Demo nursery" not in terminal.text
        terminal.press("r", "2.61", "enter")
        assert "Demo nursery" not in terminal.text
    terminal.until_text("= 2.61 mS/cm")


def test_leaving_does_not_wait_for_a_site_that_does_not_open(site: Path, open_terminal: Opened) -> None:
    with closing(sqlite3.connect(site / "logbook.sqlite3", isolation_level=None)) as other:
        other.execute("PRAGMA locking_mode = EXCLUSIVE")
        other.execute("BEGIN EXCLUSIVE")
        terminal = open_terminal(site)
        terminal.until_text("Today")
        terminal.type(b"q")
        assert terminal.wait() == 0


def test_a_newcomer_who_types_initials_into_a_number_is_told_how_to_save(tmp_path: Path, open_terminal: Opened) -> None:
    """On a fresh site, where there is no last value to compare with."""
    from fertui.workbench.keeping import make_new_site

    answers = {"crop": "tomato", "medium": "coir", "layout": "drain-blend", "area": "1200", "drain-store": "5000"}
    folder, _ = make_new_site(tmp_path / "fresh", answers)
    terminal = open_terminal(folder)
    terminal.until_text("No reading logged yet")
    terminal.press("r")
    assert "+ saves, then asks your initials" in terminal.text
    for text in ("2.6", "5.6", "21", "2900"):
        terminal.press(text, "enter")
    terminal.press("MK", "enter")
    assert "A number goes here. + saves, then asks your initials." in terminal.text
    assert "MK" not in terminal.text
    terminal.press("21", "enter", "20.5", "enter", "4.1", "+")
    give_initials(terminal)
    terminal.until_text("saved")
    terminal.press("7")
    assert "pH 5.6, temperature 21" in terminal.until_text("newest first")
    assert {entry.by for entry in open_site(folder).history(kind="reading")} == {"MK"}


def test_after_a_question_the_value_typed_anew_takes_the_place_of_the_old_one(counting: Counted) -> None:
    counting.terminal.press("r", "26", "enter")
    counting.terminal.until_text("type it again")
    counting.terminal.press("2.6", "enter")
    counting.terminal.until_text("= 2.6 mS/cm")


def test_keys_typed_before_a_question_was_seen_do_not_answer_it(site: Path, counting: Counted) -> None:
    counting.terminal.type(b"r26\r\r5.4\r")
    text = counting.terminal.until_text("keys typed ahead were left out")
    assert "26________" in text
    assert "5.4" not in next(row for row in text.splitlines() if row.startswith(" ▸"))


def test_initials_refused_or_left_save_nothing_and_say_so(site: Path, counting: Counted) -> None:
    counting.terminal.press("r", "2.6", "+")
    counting.terminal.until_text("Your initials:")
    counting.terminal.press("esc")
    counting.terminal.until_text("nothing was saved")
    assert fresh(site, "reading") == []
    counting.terminal.press("+")
    give_initials(counting.terminal)
    counting.terminal.until_text("saved")


def test_the_rule_for_initials_is_that_of_the_command_line(site: Path, counting: Counted) -> None:
    counting.terminal.press("r", "2.6", "+")
    counting.terminal.until_text("Your initials:")
    counting.terminal.press("-Mary", "enter")
    counting.terminal.until_text("Initials are 1 to 40 letters, digits, spaces")
    with pytest.raises(LogbookError, match="1 to 40 letters, digits, spaces"):
        open_site(site).void(1, why="slip", by="-Mary")
    assert fresh(site, "reading") == []


def test_star_takes_the_last_value(counting: Counted) -> None:
    counting.terminal.press("r")
    text = counting.terminal.until(lambda shown: re.search(r"EC .* last [\d.]+", shown) is not None)
    last = re.search(r"EC .* last ([\d.]+)", text)
    assert last is not None
    counting.terminal.press("*", "enter")
    counting.terminal.until_text(f"= {float(last[1]):g} mS/cm")


OFTEN = ("reading", "analysis", "batch", "acid", "sample", "note")
"""Forms opened in every run; the others behind ``long``."""
FORMS = [pytest.param(k, marks=() if k in OFTEN else pytest.mark.long) for k in KINDS if k not in ("plan", "site")]


@pytest.mark.parametrize("kind", FORMS)
def test_every_kind_has_a_form_that_opens_and_asks_for_every_field(counting: Counted, kind: str) -> None:
    direct = {"reading": "r", "analysis": "a", "water": "w", "dose": "d", "batch": "m"}
    terminal = counting.terminal
    if kind in direct:
        terminal.press(direct[kind])
    else:
        terminal.press("e", kind, "enter")
    terminal.until_text(", north bay")
    before = terminal.text
    for _ in range(40):
        terminal.type(b"\x1b[B")
    terminal.settle()
    assert "▸" in terminal.text
    terminal.press("f1")
    terminal.until_text("Keys here")
    terminal.press("esc", "esc")
    terminal.until_text("All loops, worst first")
    assert before != terminal.text


def test_what_another_session_logs_appears_by_itself_and_leaves_the_form_alone(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("7")
    terminal.until_text("newest first")
    open_site(site).record("note", {"text": "filter changed", "by": "RV"})
    terminal.until_text("filter changed")
    terminal.press("r", "2.6")
    open_site(site).record("note", {"text": "door open", "by": "RV"})
    terminal.read(3.0)
    assert "2.6_" in terminal.text
    assert "Reading" in terminal.text


def test_a_correction_asks_for_the_reason_and_both_entries_stay_visible(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    number = open_site(site).record("reading", {"EC": "2.444", "by": "MK"}).number
    terminal.press("7")
    terminal.until_text("EC 2.444")
    terminal.press("c")
    terminal.until_text(f"Correct {number}")
    terminal.press("backspace", "7", "+")
    terminal.until_text("corrected?")
    terminal.press("misread", "enter")
    give_initials(terminal)
    terminal.until_text("logged as")
    terminal.until_text("×")
    old, new = fresh(site, "reading")[-2:]
    assert (old.number_of("EC"), new.number_of("EC"), new.supersedes, new.why) == (2.444, 2.447, number, "misread")


def test_a_correction_without_a_reason_changes_nothing(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    open_site(site).record("reading", {"EC": "2.444", "by": "MK"})
    terminal.press("7")
    terminal.until_text("EC 2.444")
    terminal.press("c", "backspace", "7", "+")
    terminal.until_text("corrected?")
    terminal.press("enter")
    terminal.until_text("a reason is needed")
    assert len(fresh(site, "reading")) == 1


def test_today_tells_what_others_wrote_since_this_operator_wrote_or_looked(site: Path, open_terminal: Opened) -> None:
    bench = open_site(site)
    bench.record("note", {"text": "mine", "by": "MK"})
    for text in ("filter cleaned", "door open", "pump swapped"):
        bench.record("note", {"text": text, "by": "RV"})
    terminal = open_terminal(site, FERTUI_OPERATOR="MK")
    terminal.until_text("since you looked: 3 entries by RV")
    terminal.press("l")
    shown = terminal.until_text("since you looked   3 entries")
    assert "pump swapped" in shown
    assert "mine" not in shown
    terminal.press("1")
    terminal.until(lambda text: "worst first" in text and "since you looked" not in text)
    bench.record("note", {"text": "lamp out", "by": "JA"})
    terminal.until_text("since you looked: 1 entry by JA")


def test_without_initials_news_is_what_came_since_the_session_began(site: Path, counting: Counted) -> None:
    assert "since you looked" not in counting.terminal.text
    open_site(site).record("note", {"text": "lamp out", "by": "JA"})
    counting.terminal.until_text("since you looked: 1 entry by JA")


def test_the_unit_of_bare_numbers_changes_everywhere_and_the_last_values_with_it(site: Path, counting: Counted) -> None:
    # K 1 mmol/L is 39.1 mg/L (IUPAC atomic weight 39.0983): 5.4 mmol/L were found last time, 211 mg/L.
    terminal = counting.terminal
    terminal.press("a", "enter", "enter", "1", "2", "0", "enter")
    terminal.until_text("which cannot be")
    terminal.press("u", "u")  # meq/L, mg/L: what was typed stays and is read again
    terminal.until_text("Bare numbers are mg/L now")
    terminal.press("enter")
    terminal.until_text("K: 3.069 mmol/L")
    terminal.press("1", "9", "0", "\x1bOS")  # F4, as the field has text in it
    terminal.until_text("in mmol/L")
    terminal.press("u", "u", "backspace", "backspace", "backspace")
    terminal.press("esc")
    terminal.until_text("more to look at")
    assert fresh(site, "analysis") == []


def test_a_draft_is_taken_up_in_the_unit_it_was_typed_in(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("u", "u", "a", "enter", "enter", "1", "5", "0", "enter")
    terminal.until_text("K: 3.837 mmol/L")
    terminal.press("esc", "u", "a")
    terminal.until_text("A half-filled form")
    terminal.press("enter")
    terminal.until_text("in mg/L")
    terminal.press("f2")
    give_initials(terminal)
    terminal.until_text("saved")
    [analysis] = fresh(site, "analysis")
    assert analysis.number_of("K") == pytest.approx(150 / 39.0983, rel=1e-4)


def test_the_last_value_again_is_taken_in_the_unit_of_the_form(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    before = [entry for entry in open_site(site).history(kind="analysis") if entry.point == "root_zone"][-1]
    terminal.press("u", "u", "a", "enter", "enter", "*", "+")
    give_initials(terminal)
    terminal.until_text("saved")
    [analysis] = fresh(site, "analysis")
    assert analysis.number_of("K") == pytest.approx(before.number_of("K"), rel=0.005)  # shown to three digits


def test_a_report_of_a_source_water_names_the_water(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("a", "s", "tab", "tab", "tab", "enter", "enter", "enter", "enter", "r")
    terminal.press("shift+tab", "shift+tab", "down", "2", "+")
    give_initials(terminal)
    terminal.until_text("saved")
    [analysis] = fresh(site, "analysis")
    assert (analysis.point, analysis.text_of("source")) == ("source", "rain")


def test_a_batch_is_logged_with_every_salt_weighed(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("m", "enter", "1000", "enter", "0", "enter", "enter")
    salts = [supply.name for supply in open_site(site).site.supplies if supply.strength_pct is None]
    assert all(f" {salt} " in terminal.text for salt in salts), terminal.text
    for weight in ("88", "1.5"):
        terminal.press(weight, "enter")
        terminal.until_text(f"= {weight} kg")
    terminal.press("f2")
    give_initials(terminal)
    terminal.until_text("saved")
    [batch] = fresh(site, "batch")
    assert [(salt, batch.number_of(salt)) for salt in salts[:2]] == [(salts[0], 88.0), (salts[1], 1.5)]


def test_a_last_value_written_in_another_unit_is_shown_in_that_of_the_field(counting: Counted, site: Path) -> None:
    open_site(site).record("stock", {"tank": "calcium", "litres": "2600 ml", "by": "RV"}, "north bay")
    counting.terminal.press("r")
    counting.terminal.until(lambda shown: re.search(r"stock calcium +_+ L +last 2\.6 ", shown) is not None)


def test_a_time_typed_is_told_back_with_its_day(counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("w", "tab", "tab", "yesterday 8:00", "enter")
    assert re.search(r"when +yesterday 8:00_+ = \w{3} \d\d \w{3} \d{4} 08:00", terminal.text), terminal.text


def correcting_25_litres(site: Path, counting: Counted) -> PseudoTerminal:
    """A correction of stock logged with 25 litres, open in its form."""
    number = open_site(site).record("stock", {"tank": "calcium", "litres": "25", "by": "RV"}, "north bay").number
    terminal = counting.terminal
    terminal.press("7")
    terminal.until_text(f"▸{number}")
    terminal.press("c")
    terminal.until_text("Correct ")
    return terminal


def test_typing_takes_the_place_of_a_value_that_stood_there(site: Path, counting: Counted) -> None:
    terminal = correcting_25_litres(site, counting)
    terminal.press("down", "26", "f2")
    terminal.until_text("Why is entry")
    terminal.press("slip", "enter")
    give_initials(terminal)
    terminal.until_text("logged as")
    assert [entry.number_of("litres") for entry in fresh(site, "stock")][-1] == 26.0


def test_a_correction_is_asked_about_before_it_is_written(site: Path, counting: Counted) -> None:
    terminal = correcting_25_litres(site, counting)
    terminal.press("down", "2500", "f2")
    terminal.until_text("2500 L is more than")
    terminal.press("2x", "f2")
    assert "Why is entry" not in terminal.text
    assert re.search(r"▸ litres +2x_", terminal.text)


def test_a_draft_says_what_it_holds_and_is_judged_again(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    terminal.press("r", "2.6", "enter", "5.6", "tab", "tab", "5.9", "esc")
    drafts = site / "drafts.json"
    drafts.write_text(drafts.read_text(encoding="utf-8").replace('"5.6"', '"29"'), encoding="utf-8")
    terminal.press("r")
    terminal.until_text("drip EC 2.6 mS/cm, drip pH 29, drain EC 5.9 mS/cm")
    terminal.press("enter", "f2")
    terminal.until_text("pH 29 cannot be")
    assert re.search(r"▸ pH +29_", terminal.text)


def test_a_choice_alone_makes_no_draft(site: Path, counting: Counted) -> None:
    counting.terminal.press("a", "d", "enter", "esc")
    assert not (site / "drafts.json").exists()


def test_a_field_that_may_not_stay_empty_is_gone_to(counting: Counted) -> None:
    counting.terminal.press("m", "tab", "88", "f2")
    counting.terminal.until_text("mixed to: this cannot be left empty.")
    assert "▸ mixed to" in counting.terminal.text


def test_the_bar_of_the_logbook_follows_the_entry_that_was_corrected(site: Path, counting: Counted) -> None:
    terminal = counting.terminal
    number = open_site(site).record("note", {"text": "first", "by": "RV", "at": "yesterday 16:05"}, "north bay").number
    terminal.press("7")
    terminal.until_text(f"{number} ")
    terminal.press("down", "down", "down")
    terminal.until_text(f"▸{number}")
    terminal.press("c")
    terminal.until_text(f"Correct {number}")
    terminal.press("second", "f2")
    terminal.until_text("Why is entry")
    terminal.press("slip", "enter")
    give_initials(terminal)
    terminal.until_text(f"▸{fresh(site, 'note')[-1].number}")


def test_what_is_planned_for_next_week_does_not_stand_above_what_happened_today(site: Path, counting: Counted) -> None:
    bench = open_site(site)
    planned = bench.record("plan", {"bleed": "300", "by": "RV", "at": "2099-12-24 09:00"}, "north bay").number
    today = bench.record("note", {"text": "today", "by": "RV"}, "north bay").number
    counting.terminal.press("7")
    rows = counting.terminal.until(lambda text: f"{today} " in text and f"{planned} " in text).splitlines()
    [first, second] = [row for row in rows if re.match(rf" *▸?({today}|{planned}) ", row)]
    assert str(today) in first.split()[0]
