"""Trouble from below becomes a sentence with a way on: nothing is half saved, and what was typed is not lost."""

from __future__ import annotations

import resource
import shutil
import sqlite3
from pathlib import Path

import pytest
from conftest import Opened
from pseudo_terminal import PseudoTerminal

from fertui.workbench import open_site


@pytest.fixture
def site(todays_site: Path) -> Path:
    return todays_site


def give_initials(terminal: PseudoTerminal) -> None:
    terminal.until_text("Your initials:")
    terminal.press("M", "K", "enter")


def test_a_vanished_logbook_becomes_a_sentence(site: Path, terminal: PseudoTerminal) -> None:
    terminal.press("r", "2.6", "enter")
    terminal.until_text("= 2.6")
    for path in site.glob("logbook.sqlite3*"):
        path.unlink()
    terminal.press("+")
    give_initials(terminal)
    terminal.until_text("Nothing was saved; the form is kept.")


def test_a_locked_logbook_becomes_a_sentence_and_the_form_is_kept(site: Path, terminal: PseudoTerminal) -> None:
    terminal.press("r", "2.6", "enter", "+")
    terminal.until_text("Your initials:")
    with sqlite3.connect(site / "logbook.sqlite3", isolation_level=None) as other:
        other.execute("BEGIN EXCLUSIVE")
        terminal.press("M", "K", "enter")
        terminal.until_text("Nothing was saved; the form is kept.")
        other.execute("ROLLBACK")
    terminal.press("+")
    terminal.until_text("saved")
    assert open_site(site).history(kind="reading")[-1].number_of("EC") == 2.6


def test_a_disk_that_takes_no_more_becomes_a_sentence_and_saving_works_once_there_is_room(
    site: Path, terminal: PseudoTerminal
) -> None:
    """The system refuses every write into a file, as on a full disk; the terminal line is no file."""
    before = open_site(site).last_number()
    terminal.press("r", "2.6", "enter")
    terminal.until_text("= 2.6")
    limits = resource.prlimit(terminal.pid, resource.RLIMIT_FSIZE)
    resource.prlimit(terminal.pid, resource.RLIMIT_FSIZE, (0, limits[1]))
    terminal.press("+")
    give_initials(terminal)
    terminal.until_text("Nothing was saved; no draft can be kept either")
    assert "the disk" in terminal.text
    assert open_site(site).last_number() == before
    resource.prlimit(terminal.pid, resource.RLIMIT_FSIZE, limits)
    terminal.press("+")
    terminal.until_text("saved")
    assert open_site(site).last_number() > before


def test_a_site_file_broken_while_open_is_told_and_taken_up_once_repaired(
    site: Path, terminal: PseudoTerminal
) -> None:
    path = site / "site.toml"
    good = path.read_text(encoding="utf-8")
    path.write_text(good + "\nx = [\n", encoding="utf-8")
    assert "site.toml" in terminal.until_text("site.toml cannot be read now")
    terminal.press("esc", "2")
    terminal.until_text("normalised")
    path.write_text(good.replace("Demo nursery", "South nursery"), encoding="utf-8")
    terminal.until(lambda text: "South nursery" in text.splitlines()[0])


def test_a_change_in_site_does_not_undo_what_someone_else_wrote_meanwhile(site: Path) -> None:
    bench, path = open_site(site), site / "site.toml"
    assert bench.site.name == "Demo nursery"
    path.write_text(path.read_text(encoding="utf-8").replace("Demo nursery", "South nursery"), encoding="utf-8")
    bench.change_site("site.timezone", "Europe/Paris", "MK")
    assert (bench.site.name, bench.site.timezone) == ("South nursery", "Europe/Paris")


def test_a_vanished_folder_becomes_a_sentence(site: Path, terminal: PseudoTerminal) -> None:
    terminal.press("r", "2.6", "enter")
    terminal.until_text("= 2.6")
    shutil.rmtree(site)
    terminal.press("+")
    give_initials(terminal)
    terminal.until_text("Nothing was saved; no draft can be kept either")


def test_a_site_that_cannot_be_opened_says_what_is_wrong(site: Path, open_terminal: Opened) -> None:
    (site / "site.toml").write_text("x = [\n", encoding="utf-8")
    shown = open_terminal(site)
    assert "site.toml" in shown.until_text("The site cannot be opened").replace("\n ", "")
    shown.press("q")
    assert shown.wait() == 0


def test_a_value_of_the_site_is_changed_only_once_old_and_new_were_looked_at(
    site: Path, terminal: PseudoTerminal
) -> None:
    before = (site / "site.toml").read_text(encoding="utf-8")
    terminal.press("9", "/", "timezone", "enter", "enter", "Europe/Paris", "enter")
    terminal.until_text("Europe/Rome -> Europe/Paris: y writes it")
    terminal.press("2.6", "enter")
    terminal.until_text("Nothing was changed.")
    assert (site / "site.toml").read_text(encoding="utf-8") == before
    terminal.press("enter", "Europe/Paris", "enter", "y", "enter")
    give_initials(terminal)
    terminal.until_text("logged as")
    assert open_site(site).site.timezone == "Europe/Paris"
    terminal.press("7")
    terminal.until_text("site.timezone: Europe/Rome -> Europ")
