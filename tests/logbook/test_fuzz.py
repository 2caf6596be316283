"""Whatever is thrown at the doors: success or a refusal in words, never a traceback, never half a change."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from fertui.logbook.backup import backup, restore
from fertui.logbook.importing import import_table
from fertui.logbook.kinds import KINDS, WRITTEN_ABOUT_EVERY_ENTRY
from fertui.logbook.parse import entry_from_text
from fertui.logbook.questions import flagged, questions
from fertui.logbook.store import FILE_NAME, Logbook
from fertui.refusals import FileTrouble, Refusal
from tests.logbook.conftest import NOW, SITE

FEW, MANY = 1000, 20_000

Attack = Callable[..., None]


def attacked(examples: int) -> Callable[[Attack], Attack]:
    """Run an attack that often, without deadlines: this is no benchmark."""
    return settings(
        max_examples=examples,
        deadline=None,
        database=None,
        suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow, HealthCheck.data_too_large],
    )


def in_words(attack: Callable[[], object]) -> bool:
    """Whether it worked; a refusal must be a sentence, anything else that is raised fails the test."""
    try:
        attack()
    except (Refusal, FileTrouble) as refused:
        said = str(refused)
    else:
        return True
    assert len(said) > 10
    return False


names = st.sampled_from(
    [*WRITTEN_ABOUT_EVERY_ENTRY, *dict.fromkeys(name for kind in KINDS.values() for name in kind.names)]
    + ["NO3-N", "P2O5", "alkalinity", "N", "MKP", "why", "loop"]
)
units = st.sampled_from(
    ["", *(f" {unit}" for unit in ("mg/L", "mmol/L", "meq/L", "ppm", "kg", "m3", "%", "C", "dH", "ell"))]
)
numerals = st.one_of(
    st.floats(allow_nan=True, allow_infinity=True).map(repr),
    st.integers(-(10**400), 10**400).map(str),
    st.sampled_from(
        ["8,0", "<0,1", "1.234,5", "1 000", "", "-", "+", "0x10", "1e999", "\u0661", "\u066b", "\u00bd", "<"]
    ),
)
words = st.one_of(
    st.text(max_size=30),
    st.sampled_from(["2026-06-20", "07:30", "2026-03-29T02:30", "yesterday", "9999-12-31", "0001-01-01T00:00+14:00"]),
    st.sampled_from(
        ["feed", "drain", "root_zone", "calcium", "A", "well", "blue pen", "paste", "planted", "bay", "=1+1"]
    ),
)
cells = st.one_of(st.builds(str.__add__, numerals, units), words)


def throw_values(book: Logbook, kind: str, texts: dict[str, str]) -> None:
    """Values at the door of `record`: what is taken is stored as shown, what is refused changes nothing."""
    before = book.last_number()

    def attack() -> None:
        entry = entry_from_text(kind, texts, SITE, None, NOW)
        (number,) = book.append(flagged(entry, questions(entry, book, SITE)))
        assert book.entry(number).values == entry.values

    taken = in_words(attack)
    assert book.last_number() == before + taken


def throw_table(book: Logbook, path: Path, kind: str, table: bytes) -> None:
    """A file at the door of `import`."""
    path.write_bytes(table)
    before = book.last_number()
    if not in_words(lambda: import_table(path, kind, book, SITE, NOW, by="MK")):
        assert book.last_number() == before


def throw_backup(folder: Path, raw: bytes) -> None:
    """A file at the door of `restore`."""
    (folder / "thrown").write_bytes(raw)
    if in_words(lambda: restore(folder / "thrown", folder / "made")):
        with Logbook.open(folder / "made" / FILE_NAME) as book:
            book.history()
        for file in (folder / "made").iterdir():
            file.unlink()
        (folder / "made").rmdir()
    assert {file.name for file in folder.iterdir()} == {"thrown"}


kinds = st.sampled_from([*KINDS, "alchemy"])


@st.composite
def forms(draw: st.DrawFn) -> tuple[str, dict[str, str]]:
    """A kind and texts for it: mostly a few of its own fields, sometimes any names at all."""
    kind = draw(st.sampled_from(sorted(KINDS)))
    own = st.sampled_from([*KINDS[kind].names, "at", "note"])
    anything = st.one_of(names, st.text(max_size=8))
    chosen = (
        st.dictionaries(own, cells, min_size=1, max_size=2) if draw(st.booleans()) else st.dictionaries(anything, cells)
    )
    return kind, {"by": "MK"} | draw(chosen)


@st.composite
def tables(draw: st.DrawFn) -> bytes:
    """Tables that are nearly right: known heads, delimiters, quotes, ragged rows; or any bytes at all."""
    if draw(st.integers(0, 9)) == 0:
        return draw(st.binary(max_size=200))
    delimiter = draw(st.sampled_from([",", ";", "\t", "|"]))
    endings = st.sampled_from(["", " [mg/L]", " [mmol/L]", " [", "_L", " (%)"])
    heads = draw(st.lists(st.builds("{}{}".format, names, endings), max_size=5))
    rows = [["2026-06-20", "feed", *row] for row in draw(st.lists(st.lists(cells, max_size=6), max_size=4))]
    text = "\n".join(delimiter.join(row) for row in [["at", "point", *heads], *rows])
    return text.encode(draw(st.sampled_from(["utf-8", "utf-8-sig", "cp1252", "utf-16"])), errors="replace")


@pytest.fixture(scope="module")
def sound(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """A small sound backup."""
    folder = tmp_path_factory.mktemp("sound")
    (folder / "site.toml").write_text("[site]\n")
    with Logbook.create(folder / FILE_NAME) as book:
        for texts in ({"K": "8"}, {"EC": "2.6", "pH": "<5"}):
            book.append(entry_from_text("reading", {"by": "MK", **texts}, SITE, "bay", NOW))
        book.void(1, "typo", "MK")
    backup(folder, folder / "sound.jsonl")
    return (folder / "sound.jsonl").read_bytes()


json_values = st.recursive(
    st.one_of(st.none(), st.booleans(), st.integers(), st.floats(), st.text(max_size=10)),
    lambda inner: st.one_of(st.lists(inner, max_size=3), st.dictionaries(st.text(max_size=5), inner, max_size=3)),
    max_leaves=5,
)


@st.composite
def spoiled_backups(draw: st.DrawFn, sound: bytes) -> bytes:
    """A sound backup with one thing wrong: a key, a line, some bytes; or any bytes at all."""
    lines = sound.splitlines(keepends=True)
    way = draw(st.integers(0, 3))
    if way == 0:
        return draw(st.binary(max_size=300))
    if way == 1:
        start, length = draw(st.integers(0, len(sound))), draw(st.integers(0, 40))
        return sound[:start] + draw(st.binary(max_size=20)) + sound[start + length :]
    place = draw(st.integers(0, len(lines) - 1))
    if way == 2:
        return b"".join(lines[:place] + draw(st.sampled_from([[], lines[place:], lines[place + 1 :] + lines[:1]])))
    plain = json.loads(lines[place])
    plain[draw(st.sampled_from([*plain, "extra"]))] = draw(json_values)
    lines[place] = json.dumps(plain).encode() + b"\n"
    return b"".join(lines)


@attacked(FEW)
@given(form=forms())
def test_a_thousand_values(book: Logbook, form: tuple[str, dict[str, str]]) -> None:
    throw_values(book, *form)


@attacked(FEW)
@given(kind=kinds, table=tables())
def test_a_thousand_tables(book: Logbook, tmp_path: Path, kind: str, table: bytes) -> None:
    throw_table(book, tmp_path / "thrown.csv", kind, table)


@attacked(FEW)
@given(data=st.data())
def test_a_thousand_backups(tmp_path: Path, sound: bytes, data: st.DataObject) -> None:
    throw_backup(tmp_path, data.draw(spoiled_backups(sound)))


@pytest.mark.long
@attacked(MANY)
@given(form=forms())
def test_twenty_thousand_values(book: Logbook, form: tuple[str, dict[str, str]]) -> None:
    throw_values(book, *form)


@pytest.mark.long
@attacked(MANY)
@given(kind=kinds, table=tables())
def test_twenty_thousand_tables(book: Logbook, tmp_path: Path, kind: str, table: bytes) -> None:
    throw_table(book, tmp_path / "thrown.csv", kind, table)


@pytest.mark.long
@attacked(MANY)
@given(data=st.data())
def test_twenty_thousand_backups(tmp_path: Path, sound: bytes, data: st.DataObject) -> None:
    throw_backup(tmp_path, data.draw(spoiled_backups(sound)))
