"""Files of a site folder: private to owner and group, never followed out of the folder, written whole or not at all."""

from __future__ import annotations

import os
from collections.abc import Iterable
from pathlib import Path

from fertui.logbook.errors import DamageError, StoreError
from fertui.site.files import FILE_MODE, file_mode

FOLDER_MODE = 0o770
"""Owner and group; the umask may take more away, others never get any."""

_MAGIC = b"SQLite format 3\x00"


def check_regular(path: Path) -> None:
    """Raise ``StoreError`` unless ``path`` is a file of its own in its folder (no link, no device)."""
    if path.is_symlink():
        raise StoreError(f"{path} is a link to somewhere else and is not followed; put the file itself there.")
    if not path.exists():
        raise StoreError(
            f"there is no {path.name} in {path.parent}; `fertui new` makes a site, `fertui restore` brings one back."
        )
    if not path.is_file():
        raise StoreError(f"{path} is not a file.")


def check_whole(path: Path) -> None:
    """Raise ``StoreError`` when an SQLite file is empty, not SQLite, newer than we know, or shorter than it says.

    Only its first 100 bytes are read (SQLite file format, section 1.3: page size at 16, size in pages at 28).
    """
    try:
        with path.open("rb") as file:
            head = file.read(100)
        size = path.stat().st_size
    except OSError as error:
        raise StoreError(f"{path} cannot be read: {error.strerror}.") from error
    if not head:
        raise DamageError(f"{path} is empty (0 bytes); restore a backup with `fertui restore`.")
    if len(head) < 100 or not head.startswith(_MAGIC):
        raise StoreError(
            f"{path} is not a logbook, or its beginning is damaged; restore a backup with `fertui restore`."
        )
    page = int.from_bytes(head[16:18], "big")
    expected = int.from_bytes(head[28:32], "big") * (65536 if page == 1 else page)
    log = path.with_name(path.name + "-wal")
    if size < expected and not (log.exists() and log.stat().st_size):
        raise DamageError(
            f"{path} is cut off: {size:,} of {expected:,} bytes are there. Keep a copy; `fertui backup` saves "
            "what can still be read, `fertui restore` makes a new logbook of it."
        )


def create_private(path: Path) -> None:
    """Make an empty file that only owner and group may use; raises ``StoreError`` when it is there already."""
    try:
        os.close(os.open(path, os.O_CREAT | os.O_EXCL | os.O_WRONLY | getattr(os, "O_NOFOLLOW", 0), FILE_MODE))
    except FileExistsError as error:
        raise StoreError(f"{path} is there already and was left as it is.") from error
    except OSError as error:
        raise StoreError(f"{path} cannot be made: {error.strerror}.") from error


def publish(made: Path, path: Path) -> None:
    """Give a finished file its name, unless something stands there; raises ``StoreError`` then."""
    try:
        os.link(made, path, follow_symlinks=False)
        _sync_folder(path.parent)
    except FileExistsError as error:
        raise StoreError(f"{path} is there already and was left as it is.") from error
    except OSError as error:
        raise StoreError(f"{path} cannot be made: {error.strerror}.") from error


def make_private_folder(path: Path) -> None:
    """Make a folder for owner and group only, with its parents; an existing folder is left as it is."""
    try:
        path.mkdir(mode=FOLDER_MODE, parents=True, exist_ok=True)
    except OSError as error:
        raise StoreError(f"the folder {path} cannot be made: {error.strerror}.") from error


def quoted(path: Path) -> str:
    """The path as it stands in an SQLite address."""
    return os.fspath(path.absolute()).replace("%", "%25").replace("?", "%3f").replace("#", "%23")


def write_whole(path: Path, text: str | Iterable[str]) -> None:
    """Write a text file, whole or in parts given; a power cut leaves the old one or the new one, never half of it.

    Raises ``StoreError`` when it cannot be written or a link stands in its place.
    """
    if path.is_symlink():
        raise StoreError(f"{path} is a link to somewhere else and is not followed.")
    import tempfile

    try:
        descriptor, name = tempfile.mkstemp(prefix=f".{path.name}.", dir=path.parent)
        try:
            with os.fdopen(descriptor, "w", encoding="utf-8", newline="") as file:
                file.writelines((text,) if isinstance(text, str) else text)
                file.flush()
                os.fsync(file.fileno())
            os.chmod(name, file_mode())
            os.replace(name, path)
        except BaseException:
            os.unlink(name)
            raise
        _sync_folder(path.parent)
    except OSError as error:
        raise StoreError(f"{path} cannot be written: {error.strerror}.") from error


def _sync_folder(folder: Path) -> None:
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)
