"""Power cuts, full disks, read-only folders, many sessions: what was confirmed is there, and nothing is half there."""

from __future__ import annotations

import os
import random
import resource
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from datetime import timedelta
from pathlib import Path

import pytest

from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import StoreError
from fertui.logbook.integrity import check_book
from fertui.logbook.store import FILE_NAME, Logbook
from tests.logbook.conftest import NOW

VALUES = 12


def entry(number: int) -> Entry:
    """An entry of a dozen values that can be told from every other."""
    values = tuple(Value(f"v{place}", str(number), float(number)) for place in range(VALUES))
    return Entry("reading", "bay", NOW + timedelta(seconds=number), NOW, "MK", values, note="n" * 200)


def in_child(work: Callable[[], None]) -> int:
    """Run work in a forked process that ends without any clean-up; returns its id."""
    child = os.fork()
    if child == 0:
        try:
            work()
            os._exit(0)
        except BaseException as trouble:
            os.write(2, f"child: {trouble!r}\n".encode())
        finally:
            os._exit(1)
    return child


def succeeded(child: int) -> bool:
    """Wait for a child and say whether its work was done."""
    return os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]) == 0


def confirmed_until_killed(path: Path, chance: random.Random) -> int:
    """Last number a writer confirmed before it was killed at a random moment."""
    reading, writing = os.pipe()

    def write() -> None:
        with Logbook.open(path) as book:
            while True:
                (number,) = book.append(entry(book.last_number() + 1))
                os.write(writing, f"{number}\n".encode())

    child = in_child(write)
    os.close(writing)
    received = os.read(reading, 64)
    until = time.perf_counter() + chance.uniform(0.0, 0.004)
    while time.perf_counter() < until:
        pass
    os.kill(child, signal.SIGKILL)
    os.waitpid(child, 0)
    while part := os.read(reading, 65536):
        received += part
    os.close(reading)
    return int(received.rsplit(b"\n", 2)[-2]) if b"\n" in received else 0


def kill_writers(path: Path, kills: int) -> None:
    """Kill that many writers one after the other and look at what each left."""
    Logbook.create(path).close()
    chance = random.Random(20260701)
    for _ in range(kills):
        confirmed = confirmed_until_killed(path, chance)
        with Logbook.open(path) as book:
            last = book.last_number()
            assert last >= confirmed > 0
            assert len(book.entry(last).values) == VALUES
    with Logbook.open(path) as book:
        kept = book.history()
    assert [(each.number, each.number_of("v0"), len(each.values)) for each in kept] == [
        (number, float(number), VALUES) for number in range(1, len(kept) + 1)
    ]
    assert all(row.passed for row in check_book(path)), check_book(path)


def test_a_hundred_killed_writers_lose_nothing_they_confirmed(tmp_path: Path) -> None:
    kill_writers(tmp_path / FILE_NAME, 100)


@pytest.mark.long
def test_a_thousand_killed_writers_lose_nothing_they_confirmed(tmp_path: Path) -> None:
    kill_writers(tmp_path / FILE_NAME, 1000)


def test_four_writers_keep_two_thousand_entries_in_order_without_a_long_wait(tmp_path: Path) -> None:
    path = tmp_path / FILE_NAME
    Logbook.create(path).close()

    def write(who: int) -> None:
        longest = 0.0
        with Logbook.open(path) as book:
            for number in range(500):
                started = time.perf_counter()
                book.append(entry(1000 * who + number))
                longest = max(longest, time.perf_counter() - started)
        (tmp_path / f"wait{who}").write_text(str(longest))

    children = [in_child(lambda who=who: write(who)) for who in range(1, 5)]
    outcomes = [succeeded(child) for child in children]
    assert outcomes == [True] * 4
    with Logbook.open(path) as book:
        kept = book.history()
    assert [each.number for each in kept] == list(range(1, 2001))
    for who in range(1, 5):
        own = [each.number_of("v0") for each in kept if 1000 * who <= (each.number_of("v0") or 0) < 1000 * who + 500]
        assert own == [1000 * who + number for number in range(500)]
        assert float((tmp_path / f"wait{who}").read_text()) < 2.0
    assert all(row.passed for row in check_book(path))


def test_two_sessions_cannot_correct_the_same_entry(tmp_path: Path) -> None:
    path = tmp_path / FILE_NAME
    with Logbook.create(path) as one, Logbook.open(path) as other:
        one.append(entry(1))
        one.void(1, "typo", "MK")
        with pytest.raises(ValueError, match="already corrected"):
            other.void(1, "typo too", "AB")


def test_a_session_that_holds_the_lock_is_told_of_in_words(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("fertui.logbook.store.BUSY_SECONDS", 0.05)
    path = tmp_path / FILE_NAME
    with Logbook.create(path) as holder, Logbook.open(path) as waiting:
        holder._connection.execute("BEGIN IMMEDIATE")
        with pytest.raises(StoreError, match="another session"):
            waiting.append(entry(1))
        holder._connection.execute("ROLLBACK")
        waiting.append(entry(1))
        assert waiting.last_number() == 1


def test_a_full_disk_is_said_and_changes_nothing(tmp_path: Path) -> None:
    path = tmp_path / FILE_NAME
    with Logbook.create(path) as book:
        book.append(entry(1))
        pages = book._connection.execute("PRAGMA page_count").fetchone()[0]
        book._connection.execute(f"PRAGMA max_page_count = {pages + 2}")
        with pytest.raises(StoreError, match="disk is full"):
            book.append([entry(number) for number in range(2, 200)])
        assert book.last_number() == 1
        book._connection.execute("PRAGMA max_page_count = 1000000")
        book.append(entry(2))
    assert all(row.passed for row in check_book(path))


def test_a_disk_that_stops_taking_bytes_is_said_and_changes_nothing(tmp_path: Path) -> None:
    path = tmp_path / FILE_NAME
    with Logbook.create(path) as book:
        book.append(entry(1))

    def write() -> None:
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (100_000, 100_000))
        with Logbook.open(path) as book, pytest.raises(StoreError, match="nothing was recorded"):
            book.append([entry(number) for number in range(2, 2000)])

    assert succeeded(in_child(write))
    with Logbook.open(path) as book:
        assert book.last_number() == 1
        book.append(entry(2))
    assert all(row.passed for row in check_book(path))


def test_a_read_only_folder_can_be_read_and_says_that_it_cannot_be_written() -> None:
    # Root may write anywhere, so the work is done by another user where the tests run as root.
    folder = Path(tempfile.mkdtemp())
    try:
        with Logbook.create(folder / FILE_NAME) as book:
            book.append(entry(1))
        os.chmod(folder / FILE_NAME, 0o444)
        os.chmod(folder, 0o555)

        def work() -> None:
            if os.geteuid() == 0:
                os.setgid(65534)
                os.setuid(65534)
            with Logbook.open(folder / FILE_NAME) as book:
                assert len(book.entries()) == 1
                with pytest.raises(StoreError, match="read-only"):
                    book.append(entry(2))
            with pytest.raises(StoreError, match="cannot be made"):
                Logbook.create(folder / "other.sqlite3")

        assert succeeded(in_child(work))
        assert [file.name for file in folder.iterdir()] == [FILE_NAME]
    finally:
        os.chmod(folder, 0o755)
        (folder / FILE_NAME).unlink()
        folder.rmdir()


def test_a_logbook_that_was_moved_or_replaced_while_open_takes_nothing(tmp_path: Path) -> None:
    path = tmp_path / FILE_NAME
    with Logbook.create(path) as book:
        book.append(entry(1))
        path.rename(tmp_path / "elsewhere.sqlite3")
        with pytest.raises(StoreError, match="moved, deleted or replaced"):
            book.append(entry(2))
        # SQLite would take the log of the lost file for one of the new file's own.
        with pytest.raises(StoreError, match="log of another logbook"):
            Logbook.create(path)
        Logbook.create(tmp_path / "other.sqlite3").close()
        (tmp_path / "other.sqlite3").rename(path)
        with pytest.raises(StoreError, match="moved, deleted or replaced"):
            book.append(entry(2))


def last_number_in_another_session(path: Path) -> int:
    """What a process of its own reads, which then closes the book."""
    code = "import sys\nfrom fertui.logbook.store import Logbook\nprint(Logbook.open(sys.argv[1]).last_number())"
    return int(subprocess.check_output([sys.executable, "-c", code, str(path)], text=True))


def test_a_book_that_stays_open_keeps_what_it_writes_while_others_come_and_go(tmp_path: Path) -> None:
    """A session that ends checkpoints the log and removes it, unless it sees the locks of those still at work.

    Every way this program has to look at a book that it already holds open must leave those locks alone.
    """
    path = tmp_path / FILE_NAME
    Logbook.create(path).close()
    kept = Logbook.open(path)
    for look in (lambda: Logbook.open(path).close(), lambda: check_book(path)):
        look()
        seen = kept.last_number()
        assert last_number_in_another_session(path) == seen
        (number,) = kept.append(entry(seen + 1))
        assert last_number_in_another_session(path) == number == seen + 1
    kept.close()
    with Logbook.open(path) as book:
        assert book.last_number() == 2
