"""site.toml on disk: read whole, written beside the old one and swapped in, the old one kept."""

from __future__ import annotations

import os
import tomllib
from datetime import datetime
from pathlib import Path

from fertui.refusals import FileTrouble
from fertui.site.checks import SiteError
from fertui.site.layout import toml_of
from fertui.site.model import Site
from fertui.site.reading import site_from
from fertui.site.writing import tables_of

NAME = "site.toml"
LARGEST = 2_000_000
"""Bytes a site.toml may have: a hundred loops fit many times over."""
FILE_MODE = 0o660
"""Owner and group read and write a site, nobody else; the umask takes away more."""


def read_site(folder: Path | str) -> Site:
    """The site that ``site.toml`` in a folder describes.

    Raises ``SiteError`` where the file is missing, not TOML or says what is not allowed, ``FileTrouble`` where it
    cannot be read from disk.
    """
    path = Path(folder) / NAME
    try:
        if path.stat().st_size > LARGEST:
            raise SiteError(f"{path}: larger than {LARGEST:,} bytes; this is no site.toml.")
        raw = path.read_bytes()
    except (FileNotFoundError, NotADirectoryError) as trouble:
        raise SiteError(f"{folder}: no {NAME} there; `fertui new {folder}` makes a site.") from trouble
    except OSError as trouble:
        raise FileTrouble(f"{path} cannot be read: {trouble.strerror}.") from trouble
    return parse_site(raw, str(path))


def parse_site(raw: bytes, file: str = NAME) -> Site:
    """The site that the bytes of a site.toml describe; raises ``SiteError`` for any bytes that are none."""
    try:
        data = tomllib.loads(raw.decode("utf-8-sig"))
    except UnicodeDecodeError as trouble:
        line = raw.count(b"\n", 0, trouble.start) + 1
        raise SiteError(f"{file}, line {line}: not UTF-8 text; save the file as UTF-8.") from trouble
    except RecursionError as trouble:
        raise SiteError(f"{file}: brackets nested too deeply; this is no site.toml.") from trouble
    except ValueError as trouble:
        raise SiteError(f"{file}: not valid TOML: {trouble}.") from trouble
    return site_from(data, file)


def write_site(site: Site, folder: Path | str, now: datetime) -> Path:
    """Write ``site.toml`` into a folder and return its path; the one before stays as ``site.<date>.toml``.

    The new file is checked by reading it back before it takes the old one's place; a power cut leaves one or the other.
    Raises ``SiteError`` for a site that would be refused, ``FileTrouble`` where the folder cannot be written.
    """
    path = Path(folder) / NAME
    raw = toml_of(tables_of(site)).encode()
    parse_site(raw, f"{path} (to be written)")
    try:
        _keep(path, now)
        _replace(path, raw)
    except OSError as trouble:
        raise FileTrouble(f"{path} cannot be written: {trouble.strerror}; the old one stands.") from trouble
    return path


def _keep(path: Path, now: datetime) -> None:
    """A copy of the present site.toml, byte for byte, under a name of its own."""
    if not path.exists():
        return
    stem = f"site.{now:%Y-%m-%d}"
    names = (f"{stem}.toml", *(f"{stem}.{number}.toml" for number in range(2, 10_000)))
    kept = next(path.with_name(name) for name in names if not path.with_name(name).exists())
    _replace(kept, path.read_bytes())


def file_mode() -> int:
    """Rights of a new file: owner and group, less what the umask takes; it can only be read by setting it."""
    mask = os.umask(0o077)
    os.umask(mask)
    return FILE_MODE & ~mask


def _replace(path: Path, raw: bytes) -> None:
    """Write to a temporary file beside the path, flush it to disk, rename it, flush the folder."""
    import tempfile  # here: slow to import, and reading never needs it

    handle, temporary = tempfile.mkstemp(prefix=".site.", dir=path.parent)
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(raw)
            file.flush()
            os.fsync(file.fileno())
        os.chmod(temporary, file_mode())
        os.replace(temporary, path)
    except OSError:
        Path(temporary).unlink(missing_ok=True)
        raise
    folder = os.open(path.parent, os.O_RDONLY)
    try:
        os.fsync(folder)
    finally:
        os.close(folder)
