"""What a person chose for this program on this machine: one small file in the platform's configuration folder.

Nothing of a site is ever kept here.
"""

from __future__ import annotations

import difflib
import os
import sys
from collections.abc import Callable, Iterable, Mapping
from pathlib import Path
from typing import Any, NamedTuple

from fertui.refusals import FileTrouble, Refusal
from fertui.tui.snapshot import UNITS
from fertui.tui.themes import NAMES

FILE = "settings.toml"


class Settings(NamedTuple):
    """``theme``, ``unit``, ``ascii``: None where the program is to decide by itself. ``keys``: binding id to key."""

    theme: str | None = None
    unit: str | None = None
    ascii: bool | None = None
    mouse: bool = False
    initials_minutes: int = 15
    keys: Mapping[str, str] = {}


ALLOWED: Mapping[str, tuple[type, tuple[Any, ...]]] = {
    "theme": (str, NAMES), "unit": (str, UNITS), "ascii": (bool, ()), "mouse": (bool, ()), "initials_minutes": (int,
    ()),
    "keys": (dict, ()),
}  # fmt: skip


def configuration_folder(environment: Mapping[str, str] = os.environ, platform: str = sys.platform) -> Path:
    """Where the platform keeps settings of programs."""
    home = Path(environment.get("HOME") or Path.home())
    if platform == "darwin":
        return home / "Library" / "Application Support" / "fertui"
    return Path(environment.get("XDG_CONFIG_HOME") or home / ".config") / "fertui"


def state_folder(environment: Mapping[str, str] = os.environ, platform: str = sys.platform) -> Path:
    """Where the platform keeps what programs remember between runs."""
    home = Path(environment.get("HOME") or Path.home())
    if platform == "darwin":
        return home / "Library" / "Application Support" / "fertui"
    return Path(environment.get("XDG_STATE_HOME") or home / ".local" / "state") / "fertui"


def read_settings(known_keys: Callable[[], Iterable[str]], folder: Path | None = None) -> Settings:
    """The settings file, or the usual settings where there is none. ``known_keys`` gives the ids keys may be set for.

    Raises ``Refusal`` naming file, key, value and what is allowed, with the nearest known key for an unknown one.
    """
    path = (folder or configuration_folder()) / FILE
    if not path.is_file():
        return Settings()
    import tomllib

    try:
        table = tomllib.loads(path.read_text(encoding="utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise Refusal(
            f"{path}: not readable as TOML ({error}). Correct it, or remove it for the usual settings."
        ) from None
    for key, value in table.items():
        _check(path, key, value)
    bindings = table.get("keys", {})
    known = set(known_keys()) if bindings else set()  # collecting them loads every view: only when keys are set
    for name, key in bindings.items():
        if name not in known:
            raise Refusal(
                f"{path}: keys.{name} is not an action{_near(name, known)}. The list of actions (x) shows all names."
            )
        if not isinstance(key, str) or not key:
            raise Refusal(f"{path}: keys.{name} is {key!r}; it must be a key such as 'r', 'f2' or 'ctrl+o'.")
    return Settings(**table)


def _check(path: Path, key: str, value: object) -> None:
    if key not in ALLOWED:
        raise Refusal(f"{path}: {key!r} is not a setting{_near(key, ALLOWED)}. Settings: {', '.join(ALLOWED)}.")
    kind, choices = ALLOWED[key]
    if not isinstance(value, kind) or (kind is int and isinstance(value, bool)):
        raise Refusal(f"{path}: {key} is {value!r}; it must be a {_KIND_WORDS[kind]}.")
    if choices and value not in choices:
        raise Refusal(f"{path}: {key} is {value!r}; it can be {', '.join(choices)}.")
    if kind is int and not 1 <= int(str(value)) <= 24 * 60:
        raise Refusal(f"{path}: {key} is {value}; it must be 1 to 1440 minutes.")


_KIND_WORDS = {str: "word in quotes", bool: "true or false", int: "whole number", dict: "table"}


def _near(name: str, known: Iterable[str]) -> str:
    found = difflib.get_close_matches(name, list(known), n=1, cutoff=0.5)
    return f"; did you mean {found[0]!r}?" if found else ""


def write_settings(settings: Settings, folder: Path | None = None) -> Path:
    """Keep the settings; the file is replaced whole, so that a power cut leaves the old or the new one."""
    import tomli_w

    path = (folder or configuration_folder()) / FILE
    table = {key: value for key in ALLOWED if (value := getattr(settings, key)) not in (None, {})}
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        fresh = path.with_suffix(".new")
        fresh.write_text(tomli_w.dumps(table), encoding="utf-8")
        fresh.replace(path)
    except OSError as error:
        raise FileTrouble(
            f"{path}: settings could not be kept ({error.strerror}). They hold until you leave."
        ) from None
    return path
