"""The book keeps every entry, refuses to forget, and tells what was known when."""

from __future__ import annotations

import os
import sqlite3
import stat
from contextlib import closing
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from fertui.logbook import schema
from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import LogbookError, StoreError
from fertui.logbook.store import FILE_NAME, Logbook
from tests.logbook.conftest import NOW, Say


def reading(k: float, at: datetime = NOW, entered: datetime | None = None) -> Entry:
    """A plain reading of K."""
    return Entry("reading", "bay", at, entered or at, "MK", (Value("K", str(k), k),), point="feed")


def numbers(entries: tuple[Entry, ...]) -> list[int | None]:
    """Numbers of entries."""
    return [entry.number for entry in entries]


def test_what_is_read_is_what_was_written(book: Logbook) -> None:
    full = Entry(
        "analysis", "bay", NOW, NOW + timedelta(microseconds=1), "Zoë", (Value("K", "<0,1", 0.1, "mg/L", "K2O", True),
        Value("lab", "words \"and' -- ; DROP TABLE entries")), point="drain", zone="3", method="pore", instrument="a",
        note="two\nlines", doubtful="odd", whole_day=True, flags="unusual",
    )  # fmt: skip
    (number,) = book.append(full)
    assert book.entry(number) == full._replace(number=number)


def test_a_correction_replaces_and_a_strike_removes_but_both_stay_in_history(book: Logbook) -> None:
    book.append([reading(8), reading(9), reading(10)])
    book.append(reading(8.5)._replace(supersedes=1, why="typo"))
    book.void(2, "twice", "AB")
    assert numbers(book.entries()) == [3, 4]
    assert numbers(book.history()) == [1, 2, 3, 4, 5]
    assert (book.superseded_by(1), book.superseded_by(3)) == (4, None)
    assert book.last("reading", "bay", point="feed") == book.entry(4)


def test_at_hides_later_events_and_known_hides_later_knowledge(book: Logbook) -> None:
    day = timedelta(days=1)
    book.append([reading(8, NOW, NOW), reading(9, NOW + day, NOW + 3 * day)])
    book.append(reading(7, NOW, NOW + 2 * day)._replace(supersedes=1, why="lab sent a correction"))
    assert numbers(book.entries(at=NOW)) == [3]
    assert numbers(book.entries(known=NOW + day)) == [1]
    assert numbers(book.entries(known=NOW + 2 * day)) == [3]
    assert numbers(book.entries(since=NOW + day)) == [2]
    assert numbers(book.history(known=NOW + 2 * day)) == [1, 3]


def test_a_plan_is_known_from_when_it_was_made(book: Logbook) -> None:
    day = timedelta(days=1)
    book.append([reading(7, NOW + 5 * day, NOW)._replace(kind="plan"), reading(8, NOW + 5 * day, NOW)])
    assert numbers(book.entries(at=NOW)) == [1]
    assert numbers(book.entries(at=NOW - day)) == []
    assert numbers(book.entries(at=NOW, known=NOW - day)) == []


def test_words_are_never_read_as_sql(book: Logbook) -> None:
    book.append(reading(8))
    attack = "bay' OR '1'='1"
    assert book.entries(loop=attack) == book.history(kinds=(attack,)) == ()
    assert book.last("reading", point=attack) is None


def test_a_loop_sees_its_own_and_the_sites_entries(book: Logbook) -> None:
    book.append([reading(8), reading(9)._replace(loop="gutters"), reading(1)._replace(kind="note", loop="")])
    assert numbers(book.entries(loop="bay")) == [1, 3]
    assert numbers(book.entries(kinds=("note", "site"))) == [3]
    assert book.entries(kinds=()) == ()


@pytest.mark.parametrize(
    ("entry", "says"),
    [
        (reading(1)._replace(supersedes=1), "needs its reason"),
        (reading(1)._replace(supersedes=99, why="x"), "no entry 99"),
        (reading(1)._replace(supersedes=2, why="x"), "already corrected by entry 3"),
        (reading(1)._replace(supersedes=4, why="x"), "strikes another"),
        (reading(1)._replace(number=77), "cannot follow"),
        (reading(1)._replace(values=(Value("K", "x", float("nan")),)), "not a number"),
        (reading(1)._replace(values=(Value("K", "1", 1.0), Value("K", "2", 2.0))), "twice"),
        (reading(1)._replace(note="\ud800"), "not text"),
        (reading(1)._replace(at=datetime(2026, 1, 1)), "no zone"),
        (reading(1)._replace(by=None), "cannot be None"),
    ],
)
def test_an_entry_that_cannot_be_kept_leaves_its_whole_batch_out(book: Logbook, entry: Entry, says: str) -> None:
    book.append([reading(1), reading(2)])
    book.append(reading(3)._replace(supersedes=2, why="x"))
    book.void(1, "x", "MK")
    before = book.history()
    with pytest.raises(LogbookError, match=says):
        book.append([reading(5), entry])
    assert book.history() == before


@pytest.mark.parametrize(
    "statement",
    [
        "UPDATE entries SET by = 'x'",
        "DELETE FROM entries",
        "UPDATE entry_values SET number = 1",
        "DELETE FROM entry_values",
        "INSERT OR REPLACE INTO entries SELECT * FROM entries WHERE number = 1",
        "INSERT INTO entry_values VALUES (1, 9, 'Ca', '5', 5.0, '', '', 0)",
        "DELETE FROM migrations",
    ],
)
def test_the_file_itself_refuses_to_forget(book: Logbook, statement: str) -> None:
    book.append([reading(8), reading(9)])
    before = book.history()
    with closing(sqlite3.connect(book.path)) as other, pytest.raises(sqlite3.IntegrityError):
        other.execute(statement)
    assert book.history() == before


def test_only_owner_and_group_may_use_the_file(tmp_path: Path) -> None:
    before = os.umask(0o000)
    try:
        with Logbook.create(tmp_path / FILE_NAME) as book:
            book.append(reading(8))
            files = list(tmp_path.iterdir())
            assert {stat.S_IMODE(file.stat().st_mode) for file in files} == {0o660}
        os.umask(0o077)
        Logbook.create(tmp_path / "narrow.sqlite3").close()
        assert stat.S_IMODE((tmp_path / "narrow.sqlite3").stat().st_mode) == 0o600
    finally:
        os.umask(before)


def test_files_that_are_not_a_logbook_of_ours_are_refused_untouched(tmp_path: Path, book: Logbook) -> None:
    book.append(reading(8))
    book.close()
    (tmp_path / "empty.sqlite3").touch()
    (tmp_path / "words.sqlite3").write_text("hello " * 100)
    (tmp_path / "folder.sqlite3").mkdir()
    (tmp_path / "link.sqlite3").symlink_to(tmp_path / FILE_NAME)
    with closing(sqlite3.connect(tmp_path / "other.sqlite3")) as other:
        other.execute("CREATE TABLE t (x)")
    for name in ("absent", "empty", "words", "folder", "link", "other"):
        path = tmp_path / f"{name}.sqlite3"
        before = path.read_bytes() if path.is_file() else b""
        with pytest.raises(StoreError):
            Logbook.open(path)
        assert (path.read_bytes() if path.is_file() else b"") == before
    with pytest.raises(StoreError, match="there already"):
        Logbook.create(tmp_path / FILE_NAME)


def test_a_newer_logbook_is_refused_untouched(book: Logbook) -> None:
    book.append(reading(8))
    book.close()
    with closing(sqlite3.connect(book.path)) as other:
        other.execute(f"PRAGMA user_version = {schema.VERSION + 1}")
    before = book.path.read_bytes()
    with pytest.raises(StoreError, match="newer fertui"):
        Logbook.open(book.path)
    assert book.path.read_bytes() == before
    assert [file.name for file in book.path.parent.iterdir()] == [FILE_NAME]


OLD_BOOKS = sorted((Path(__file__).parent / "old_books").glob("version_*.sqlite3"))


@pytest.mark.parametrize("old", OLD_BOOKS, ids=lambda path: path.stem)
def test_the_book_of_every_released_schema_opens(old: Path, tmp_path: Path) -> None:
    copy = tmp_path / FILE_NAME
    copy.write_bytes(old.read_bytes())
    with Logbook.open(copy) as book:
        assert [entry.text_of("K") for entry in book.entries(kinds=("reading",))] == ["8,0", "7.9"]
        book.append(reading(8))
        assert book.last_number() == 5


def test_there_is_an_old_book_for_every_version() -> None:
    assert [path.stem for path in OLD_BOOKS] == [f"version_{version}" for version in range(1, schema.VERSION + 1)]


def test_migrations_run_once_in_order_and_are_recorded(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with Logbook.create(tmp_path / FILE_NAME) as book:
        book.append(reading(8))
    later = (*schema.MIGRATIONS, ("a table more", "CREATE TABLE more (x INTEGER) STRICT;"))
    monkeypatch.setattr(schema, "MIGRATIONS", later)
    monkeypatch.setattr(schema, "VERSION", len(later))
    for _ in range(2):
        with Logbook.open(tmp_path / FILE_NAME) as book:
            assert numbers(book.entries()) == [1]
    with closing(sqlite3.connect(tmp_path / FILE_NAME)) as plain:
        rows = plain.execute("SELECT version, what FROM migrations ORDER BY version").fetchall()
    assert rows == list(enumerate((what for what, _ in later), start=1))


def test_a_migration_that_fails_leaves_the_old_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    Logbook.create(tmp_path / FILE_NAME).close()
    before = (tmp_path / FILE_NAME).read_bytes()
    broken = (*schema.MIGRATIONS, ("broken", "CREATE TABLE fine (x INTEGER) STRICT; CREATE TABLE entries (x INTEGER);"))
    monkeypatch.setattr(schema, "MIGRATIONS", broken)
    monkeypatch.setattr(schema, "VERSION", len(broken))
    with pytest.raises(StoreError):
        Logbook.open(tmp_path / FILE_NAME)
    assert (tmp_path / FILE_NAME).read_bytes() == before


def test_opening_needs_nothing_heavy(say: Say) -> None:
    import subprocess
    import sys

    heavy = "{'numpy', 'scipy', 'pint', 'textual'}"
    code = f"import sys, fertui.logbook.store, fertui.logbook.parse; print(sorted({heavy} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_moments_keep_their_order_as_text(book: Logbook) -> None:
    moments = [datetime(year, 1, 1, tzinfo=UTC) for year in (1971, 1999, 2026, 9998)]
    book.append([reading(1, moment, NOW) for moment in reversed(moments)])
    assert [entry.at for entry in book.entries()] == moments
