"""The whole book out and in again; damage is said, and what can be read of a damaged book is saved."""

from __future__ import annotations

import sqlite3
import threading
from collections.abc import Callable
from contextlib import closing
from datetime import timedelta
from pathlib import Path

import pytest

from fertui.logbook.backup import SITE_FILE, backup, restore
from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import LogbookError, StoreError
from fertui.logbook.integrity import DAMAGED, check_book
from fertui.logbook.store import FILE_NAME, Logbook
from fertui.refusals import Refusal
from tests.logbook.conftest import NOW

SITE_TEXT = '[site]\nname = "Kas"  # a comment, kept\r\n'


def entry(number: int) -> Entry:
    """An entry that can be told from every other."""
    at = NOW + timedelta(minutes=number)
    values = (Value("K", f"{number},5", number + 0.5, "mmol/L"), Value("lab", "Zoë's"))
    return Entry("analysis", "bay", at, at, "MK", values, point="drain", note="n" * 80)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A site folder with 400 entries, a correction and a strike."""
    made = tmp_path / "site"
    made.mkdir()
    (made / SITE_FILE).write_bytes(SITE_TEXT.encode())
    with Logbook.create(made / FILE_NAME) as book:
        book.append([entry(number) for number in range(400)])
        book.append(entry(9)._replace(supersedes=7, why="other sample"))
        book.void(8, "twice", "AB")
    return made


def history(folder: Path) -> tuple[Entry, ...]:
    """Every entry of a site's book."""
    with Logbook.open(folder / FILE_NAME) as book:
        return book.history()


def test_a_backup_restores_every_entry_correction_time_and_the_site_file(folder: Path, tmp_path: Path) -> None:
    backup(folder, tmp_path / "book.jsonl")
    restore(tmp_path / "book.jsonl", tmp_path / "again")
    assert history(tmp_path / "again") == history(folder)
    assert (tmp_path / "again" / SITE_FILE).read_bytes() == SITE_TEXT.encode()
    assert all(row.passed for row in check_book(tmp_path / "again" / FILE_NAME))
    backup(tmp_path / "again", tmp_path / "second.jsonl")
    assert (tmp_path / "second.jsonl").read_bytes() == (tmp_path / "book.jsonl").read_bytes()


def test_both_backups_can_be_made_while_another_session_writes(folder: Path, tmp_path: Path) -> None:
    done = threading.Event()

    def write() -> None:
        with Logbook.open(folder / FILE_NAME) as book:
            while not done.is_set():
                book.append(entry(1))

    writer = threading.Thread(target=write)
    writer.start()
    try:
        backup(folder, tmp_path / "book.jsonl")
        backup(folder, tmp_path / "copy.sqlite3")
    finally:
        done.set()
        writer.join()
    restore(tmp_path / "book.jsonl", tmp_path / "again")
    for saved in (tmp_path / "again" / FILE_NAME, tmp_path / "copy.sqlite3"):
        assert all(row.passed for row in check_book(saved))
        with Logbook.open(saved) as book:
            assert book.last_number() >= 402


def test_a_backup_never_overwrites(folder: Path, tmp_path: Path) -> None:
    for name in ("book.jsonl", "copy.sqlite3"):
        (tmp_path / name).write_text("mine")
        with pytest.raises(StoreError, match="there already"):
            backup(folder, tmp_path / name)
        assert (tmp_path / name).read_text() == "mine"


def test_a_restore_never_goes_into_a_folder_in_use(folder: Path, tmp_path: Path) -> None:
    backup(folder, tmp_path / "book.jsonl")
    before = history(folder)
    with pytest.raises(StoreError, match="not an empty folder"):
        restore(tmp_path / "book.jsonl", folder)
    assert history(folder) == before


Spoil = Callable[[bytes], bytes]


@pytest.mark.parametrize(
    ("spoil", "says"),
    [
        (lambda raw: b"", "empty"),
        (lambda raw: raw[: len(raw) // 2], "not a line|cut off"),
        (lambda raw: b"".join(raw.splitlines(True)[:-1]), "cut off"),
        (lambda raw: raw + raw, "goes on"),
        (lambda raw: raw.replace(b"17.5", b"18.5"), "changed or damaged"),
        (
            lambda raw: b"".join(line for line in raw.splitlines(True) if b'"number": 401' not in line),
            "changed or damaged",
        ),
        (lambda raw: raw.replace(b'"analysis"', b'"alchemy"', 1), "alchemy"),
        (lambda raw: raw.replace(b"fertui.backup/1", b"fertui.backup/9"), "not a backup this fertui knows"),
        (lambda raw: raw.replace(b"17.5", b"NaN", 1), "number"),
        (lambda raw: b"[" * 100_000, "not a line"),
        (lambda raw: b"\xff\xfe" + raw, "not text"),
        (lambda raw: raw.replace(b"+", b"").replace(b'Z"', b'"', 4), "no zone"),
    ],
)
def test_a_spoiled_backup_is_refused_and_leaves_nothing(folder: Path, tmp_path: Path, spoil: Spoil, says: str) -> None:
    backup(folder, tmp_path / "book.jsonl")
    (tmp_path / "spoiled.jsonl").write_bytes(spoil((tmp_path / "book.jsonl").read_bytes()))
    before = sorted(tmp_path.iterdir())
    with pytest.raises(Refusal, match=says):
        restore(tmp_path / "spoiled.jsonl", tmp_path / "again")
    assert sorted(tmp_path.iterdir()) == before


def spoiled(folder: Path, into: Path, spoil: Spoil) -> Path:
    """A site whose logbook file was spoiled."""
    into.mkdir()
    (into / FILE_NAME).write_bytes(spoil((folder / FILE_NAME).read_bytes()))
    return into


def test_a_cut_off_file_is_detected_and_what_is_readable_is_saved(folder: Path, tmp_path: Path) -> None:
    cut = spoiled(folder, tmp_path / "cut", lambda raw: raw[: len(raw) * 2 // 3])
    assert not all(row.passed for row in check_book(cut / FILE_NAME))
    with pytest.raises(StoreError, match="cut off"):
        Logbook.open(cut / FILE_NAME)
    with pytest.raises(StoreError, match="What can be read was saved"):
        backup(cut, tmp_path / "saved.jsonl")
    restore(tmp_path / "saved.jsonl", tmp_path / "again")
    whole = {each.number: each for each in history(folder)}
    saved = [each for each in history(tmp_path / "again") if DAMAGED not in each.doubtful]
    assert len(saved) > 100
    assert all(each == whole[each.number] for each in saved)


def test_damage_in_the_middle_costs_only_what_it_hit(folder: Path, tmp_path: Path) -> None:
    whole = history(folder)
    place = (folder / FILE_NAME).read_bytes().index(b"n" * 80)
    bad = spoiled(folder, tmp_path / "bad", lambda raw: raw[:place] + b"\xff" * 30 + raw[place + 30 :])
    assert not all(row.passed for row in check_book(bad / FILE_NAME))
    with pytest.raises(StoreError, match="saved"):
        backup(bad, tmp_path / "saved.jsonl")
    restore(tmp_path / "saved.jsonl", tmp_path / "again")
    saved = history(tmp_path / "again")
    assert len(saved) == len(whole)
    assert sum(one != other for one, other in zip(saved, whole, strict=True)) <= 3


def test_a_number_changed_past_the_program_breaks_the_chain(folder: Path, tmp_path: Path) -> None:
    with closing(sqlite3.connect(folder / FILE_NAME)) as plain:
        plain.execute("DROP TRIGGER values_keep")
        plain.execute("UPDATE entry_values SET number = 99.0 WHERE entry = 50 AND name = 'K'")
        plain.commit()
    broken = [row for row in check_book(folder / FILE_NAME) if not row.passed]
    assert [row.found for row in broken] == ["breaks at entry 50"]
    with pytest.raises(StoreError, match="1 of them lost or in doubt"):
        backup(folder, tmp_path / "saved.jsonl")


def test_an_unreadable_file_is_said_and_nothing_is_written(tmp_path: Path, folder: Path) -> None:
    bad = spoiled(folder, tmp_path / "bad", lambda raw: raw[:50])
    with pytest.raises(StoreError):
        backup(bad, tmp_path / "saved.jsonl")
    assert not (tmp_path / "saved.jsonl").exists()


def test_a_backup_of_no_logbook_is_refused(tmp_path: Path) -> None:
    with pytest.raises((LogbookError, StoreError)):
        backup(tmp_path, tmp_path / "saved.jsonl")
    with pytest.raises(Refusal):
        restore(tmp_path / "absent.jsonl", tmp_path / "again")
    assert list(tmp_path.iterdir()) == []
