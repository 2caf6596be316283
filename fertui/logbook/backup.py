"""The whole book out and in again, verbatim: as lines of JSON with the site file, or as a copy of the SQLite file."""

from __future__ import annotations

import itertools
import json
import os
import shutil
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from fertui.logbook.codec import check_text, entry_of, line_of
from fertui.logbook.entries import Entry
from fertui.logbook.errors import DamageError, LogbookError, StoreError
from fertui.logbook.files import create_private, make_private_folder, publish, write_whole
from fertui.logbook.integrity import DAMAGED, readable
from fertui.logbook.store import FILE_NAME, FIRST_HASH, Logbook, link_of

FORMAT = "fertui.backup/1"
SITE_FILE = "site.toml"
LONGEST_LINE = 8_000_000
_CHUNK = 1000


def backup(folder: str | Path, file: str | Path) -> Path:
    """Write the whole book of a site into a new file, while it is in use; returns the file's path.

    A name ending in ``.sqlite3`` makes a copy of the SQLite file. Any other makes lines of JSON: a head with the site
    file, one line an entry, and a last line with count and chain. Raises ``StoreError`` when the file is there already
    or cannot be written; and when the book is damaged, after what can be read of it was saved, each lost entry as a
    note in its place.
    """
    source, path = Path(folder), Path(file)
    if path.exists() or path.is_symlink():
        raise StoreError(f"{path} is there already and was left as it is; give the backup a new name.")
    if path.suffix == ".sqlite3":
        return _copied(source / FILE_NAME, path)
    try:
        with Logbook.open(source / FILE_NAME) as book:
            write_whole(path, _lines(_sound(book), _site_text(source)))
    except DamageError as damage:
        saved = _salvaged(source, path)
        raise StoreError(f"{damage} What can be read was saved: {saved} to {path}.") from damage
    return path


def restore(file: str | Path, folder: str | Path) -> Path:
    """Make a site folder of a backup: site file and logbook with numbers, times, authors and corrections; its path.

    Raises ``LogbookError`` for a file that is no backup, is cut off or was changed, ``StoreError`` when the folder is
    there and not empty, or cannot be made. Nothing is left behind then.
    """
    path, into = Path(file), Path(folder)
    if into.is_symlink() or (into.exists() and not (into.is_dir() and not any(into.iterdir()))):
        raise StoreError(f"{into} is there and not an empty folder; it was left as it is. Restore into a new one.")
    making = into.with_name(f".{into.name}.restoring")
    try:
        lines = _numbered(path)
        site_text = _head(path, lines)
        _fill(making / FILE_NAME, _batches(path, lines))
        if site_text:
            write_whole(making / SITE_FILE, site_text)
        os.replace(making, into)
    except OSError as error:
        raise StoreError(f"{into} cannot be made: {error.strerror}.") from error
    finally:
        shutil.rmtree(making, ignore_errors=True)
    return into


def _copied(source: Path, path: Path) -> Path:
    making = path.with_name(f".{path.name}.making")
    with Logbook.open(source) as book:
        create_private(making)
        try:
            book.copy_into(making)
            publish(making, path)
        finally:
            making.unlink(missing_ok=True)
    return path


def _sound(book: Logbook) -> Iterator[Entry]:
    """Entries of a book whose chain holds; raises ``DamageError`` where it breaks."""
    chain = FIRST_HASH
    for entry, link in book.linked():
        chain = link_of(chain, entry)
        if chain != link:
            raise DamageError(f"{book.path} is damaged: the chain of entries breaks at entry {entry.number}.")
        yield entry


def _salvaged(source: Path, path: Path) -> str:
    entries = tuple(readable(source / FILE_NAME))
    write_whole(path, _lines(entries, _site_text(source)))
    damaged = sum(DAMAGED in entry.doubtful for entry in entries)
    return f"entries 1 to {len(entries)}, {damaged} of them lost or in doubt (any later ones are lost),"


def _lines(entries: Iterable[Entry], site_text: str) -> Iterator[str]:
    yield f"{json.dumps({'backup': FORMAT, 'site': site_text}, ensure_ascii=False)}\n"
    count, chain = 0, FIRST_HASH
    for entry in entries:
        count, chain = count + 1, link_of(chain, entry)
        yield f"{line_of(entry)}\n"
    yield f"{json.dumps({'entries': count, 'chain': chain})}\n"


def _fill(making: Path, batches: Iterator[list[Entry]]) -> None:
    """Write batches of entries into a new book; the first is read before the file is made."""
    first = next(batches, [])
    make_private_folder(making.parent)
    with Logbook.create(making) as book:
        for batch in itertools.chain([first], batches):
            book.append(batch)


def _batches(path: Path, lines: Iterator[tuple[int, str]]) -> Iterator[list[Entry]]:
    """Entries of a backup, held against its last line; raises ``LogbookError`` for a line that is none or misplaced."""
    batch: list[Entry] = []
    count, chain, end = 0, FIRST_HASH, None
    for number, line in lines:
        plain = _decoded(line, number, path)
        if end is not None:
            raise LogbookError(f"{path} goes on after its last line; it is not one backup.")
        if plain.keys() == {"entries", "chain"}:
            end = plain
            continue
        batch.append(_entry(plain, number, path))
        count, chain = count + 1, link_of(chain, batch[-1])
        if len(batch) == _CHUNK:
            yield batch
            batch = []
    if end is None:
        raise LogbookError(f"{path} is cut off: its last line is missing. Use another backup.")
    if end != {"entries": count, "chain": chain}:
        raise LogbookError(f"{path} was changed or damaged: its entries do not match its last line.")
    yield batch


def _entry(plain: dict[str, Any], number: int, path: Path) -> Entry:
    try:
        return entry_of(plain)
    except LogbookError as error:
        raise LogbookError(f"{path}, line {number}: {error}") from error


def _decoded(line: str, number: int, path: Path) -> dict[str, Any]:
    try:
        plain = json.loads(line)
    except (ValueError, RecursionError) as error:
        raise LogbookError(f"{path}, line {number} is not a line of a backup.") from error
    if not isinstance(plain, dict):
        raise LogbookError(f"{path}, line {number} is not a line of a backup.")
    return plain


def _head(path: Path, lines: Iterator[tuple[int, str]]) -> str:
    """Site file of a backup, '' where the backup holds none; raises ``LogbookError`` for a file that is no backup."""
    number, line = next(lines, (0, ""))
    if not number:
        raise LogbookError(f"{path} is empty; nothing was restored.")
    plain = _decoded(line, number, path)
    if plain.get("backup") != FORMAT or not isinstance(plain.get("site"), str) or len(plain) != 2:
        raise LogbookError(f"{path} is not a backup this fertui knows ({FORMAT}); nothing was restored.")
    check_text("site", plain["site"], lines=True)
    return str(plain["site"])


def _numbered(path: Path) -> Iterator[tuple[int, str]]:
    try:
        with path.open("rb") as file:
            for number in itertools.count(1):
                line = file.readline(LONGEST_LINE)
                if not line:
                    return
                if len(line) == LONGEST_LINE:
                    raise LogbookError(f"{path}, line {number} is longer than any line of a backup.")
                yield number, line.decode("utf-8")
    except UnicodeDecodeError as error:
        raise LogbookError(f"{path} is not a backup: it is not text.") from error
    except (OSError, ValueError) as error:
        if isinstance(error, LogbookError):
            raise
        raise LogbookError(f"{path} cannot be read: {getattr(error, 'strerror', None) or error}.") from error


def _site_text(folder: Path) -> str:
    try:
        return (folder / SITE_FILE).read_bytes().decode("utf-8")
    except FileNotFoundError:
        return ""
    except (OSError, UnicodeDecodeError) as error:
        raise StoreError(f"{folder / SITE_FILE} cannot be read: {error}.") from error
