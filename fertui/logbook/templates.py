"""How one laboratory or one logger writes its tables: a named mapping, kept as a small TOML file in the site folder."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any, NamedTuple

from fertui.logbook.dates import ORDERS
from fertui.logbook.errors import LogbookError
from fertui.logbook.files import check_regular, make_private_folder, write_whole
from fertui.logbook.kinds import nearest

FOLDER = "templates"
_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9 _.-]{0,59}")


class Template(NamedTuple):
    """What is said once about the tables of one source.

    ``columns``: head -> name with unit (``"Nitraat" = "NO3 [mg/L]"``); ``points``: words of the table -> points;
    ``ignore``: heads left out; ``blank``: cells that mean not measured; ``dates``: ymd, dmy or mdy;
    ``delimiter``, ``decimal``: sniffed where empty; ``values``: names every row gets (lab, method, point, by).
    """

    columns: Mapping[str, str] = {}
    points: Mapping[str, str] = {}
    ignore: tuple[str, ...] = ()
    blank: tuple[str, ...] = ()
    dates: str = ""
    delimiter: str = ""
    decimal: str = ""
    values: Mapping[str, str] = {}


def read_template(site_folder: Path, name: str) -> Template:
    """The template of that name in a site folder.

    Raises ``LogbookError`` when there is none (known ones are named) or a key or value of it cannot be.
    """
    path = _path(site_folder, name)
    if not path.exists():
        known = sorted(each.stem for each in path.parent.glob("*.toml"))
        raise LogbookError(f"there is no template {name!r}{nearest(name, known)}. Known: {', '.join(known) or 'none'}.")
    check_regular(path)
    try:
        table = tomllib.loads(path.read_text(encoding="utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise LogbookError(f"{path}: {error}.") from error
    return _checked(table, str(path))


def save_template(site_folder: Path, name: str, template: Template) -> Path:
    """Write a template into a site folder, in place of the one of that name; returns its path."""
    import tomli_w

    path = _path(site_folder, name)
    _checked(template._asdict(), name)
    make_private_folder(path.parent)
    write_whole(path, tomli_w.dumps({key: value for key, value in template._asdict().items() if value}))
    return path


def _path(site_folder: Path, name: str) -> Path:
    if not _NAME.fullmatch(name):
        raise LogbookError(f"{name!r} cannot name a template: letters, digits, spaces, _ . and - only, up to 60.")
    return site_folder / FOLDER / f"{name}.toml"


def _checked(table: Mapping[str, Any], where: str) -> Template:
    known = Template._fields
    for key, value in table.items():
        if key not in known:
            raise LogbookError(
                f"{where}: {key!r} is not a key of a template{nearest(key, known)}. Known: {', '.join(known)}."
            )
        if not _fits(key, value):
            raise LogbookError(f"{where}: {key} = {value!r} is not what it takes; see docs/files.md, templates.")
    held: dict[str, Any] = {key: tuple(value) if isinstance(value, list) else value for key, value in table.items()}
    return Template(**held)


def _fits(key: str, value: object) -> bool:
    if key in ("columns", "points", "values"):
        return isinstance(value, Mapping) and all(isinstance(word, str) for pair in value.items() for word in pair)
    if key in ("ignore", "blank"):
        return isinstance(value, (list, tuple)) and all(isinstance(word, str) for word in value)
    allowed = {"dates": ("", *ORDERS), "decimal": ("", ".", ","), "delimiter": ("", ",", ";", "\t", "|")}
    return value in allowed[key]
