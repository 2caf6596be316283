"""docs/files.md on the logbook holds: its queries run in plain SQLite, its template is one, its lines are written."""

from __future__ import annotations

import hashlib
import json
import re
import sqlite3
import tomllib
from contextlib import closing
from pathlib import Path

import pytest

from fertui.logbook.backup import backup
from fertui.logbook.parse import corrected
from fertui.logbook.rows import COLUMNS
from fertui.logbook.store import Logbook
from fertui.logbook.templates import Template, read_template, save_template
from tests.logbook.conftest import NOW, SITE, Say

PAGE = (Path(__file__).parents[2] / "docs" / "files.md").read_text(encoding="utf-8")
COUNTS, CORRECTIONS, KNOWN, ANALYSES, DISCHARGES = re.findall(r"```sql\n(.*?)```", PAGE, re.DOTALL)


@pytest.fixture
def written(book: Logbook, say: Say) -> Logbook:
    """A book with an analysis corrected, a reading struck, and bleeds."""
    early = NOW.replace(day=20, month=6)
    book.append(say("analysis", point="drain", at="2026-06-15", K="80", Ca="9", Mg="4", EC="3.1", now=early))
    book.append(say("reading", point="feed", EC="2.6", now=early))
    book.append(say("bleed", litres="2 m3", reason="sodium", at="2026-06-16", now=early))
    book.append(say("bleed", litres="500", reason="sodium", at="2026-06-18", now=early))
    book.append(corrected(book.entry(1), {"K": "8.0"}, SITE, NOW, why="decimal mark", by="AB"))
    book.void(2, "wrong loop", "AB", NOW)
    return book


def asked(book: Logbook, query: str) -> list[tuple[object, ...]]:
    """Rows of a query by plain SQLite, read-only."""
    with closing(sqlite3.connect(f"file:{book.path}?mode=ro", uri=True)) as plain:
        return plain.execute(query).fetchall()


def test_the_query_of_what_counts_gives_what_the_program_counts(written: Logbook) -> None:
    counted = [
        (entry.number, value.name, value.number, value.text) for entry in written.entries() for value in entry.values
    ]
    assert [(row[0], row[6], row[7], row[8]) for row in asked(written, COUNTS)] == counted
    assert len(counted) == 10


def test_the_query_of_corrections_shows_old_new_who_when_and_why(written: Logbook) -> None:
    rows = asked(written, CORRECTIONS)
    assert [(row[1], row[2], row[3], row[4], row[5], row[6], row[7], row[8]) for row in rows] == [
        ("AB", "decimal mark", 1, 5, 0, "K", "80", "8.0"),
        ("AB", "wrong loop", 2, 6, 1, "EC", "2.6", None),
    ]


def test_the_query_of_what_was_known_is_that_of_known(written: Logbook) -> None:
    known = written.entries(known=NOW.replace(month=6, day=30, hour=22))
    assert [row[0] for row in asked(written, KNOWN)] == [entry.number for entry in known] == [1, 3, 4, 2]


def test_the_queries_of_analyses_and_discharges(written: Logbook) -> None:
    assert asked(written, ANALYSES) == [("2026-06-15", "bay", "drain", 8.0, 9.0, 4.0, 3.1)]
    assert asked(written, DISCHARGES) == [("bay", "2026-06", "sodium", 2500.0)]


def test_tables_and_columns_are_those_of_the_page(written: Logbook) -> None:
    for table in ("entries", "entry_values", "migrations"):
        (row,) = [line for line in PAGE.splitlines() if line.startswith(f"| `{table}` |")]
        for column in asked(written, f"SELECT name FROM pragma_table_info('{table}')"):
            assert f"`{column[0]}`" in row or table == "migrations"


def test_the_example_template_is_one(tmp_path: Path) -> None:
    example = next(each for each in re.findall(r"```toml\n(.*?)```", PAGE, re.DOTALL) if "[points]" in each)
    save_template(tmp_path, "lab", Template()).write_text(example)
    assert read_template(tmp_path, "lab").points == tomllib.loads(example)["points"]


def test_the_lines_of_a_backup_and_the_chain_are_as_the_page_says(written: Logbook, tmp_path: Path) -> None:
    backup(written.path.parent, tmp_path / "book.jsonl")
    head, *lines, end = (tmp_path / "book.jsonl").read_text(encoding="utf-8").splitlines()
    assert json.loads(head) == {"backup": "fertui.backup/1", "site": ""}
    chain = "0" * 64
    for line in lines:
        assert list(json.loads(line)) == sorted([*COLUMNS, "values"])
        chain = hashlib.sha256(f"{chain}\n{line}".encode()).hexdigest()
    assert json.loads(end) == {"entries": 6, "chain": chain}
    assert asked(written, "SELECT hash FROM entries ORDER BY number DESC LIMIT 1") == [(chain,)]
