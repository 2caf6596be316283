"""How site.toml looks: one heading a table, small tables on one line, whole numbers without a point."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from typing import Any

LONGEST_LINE = 200
BARE = re.compile(r"[A-Za-z0-9_-]+")


def toml_of(tables: Mapping[str, Any]) -> str:
    """TOML text of top-level tables and lists of tables, in their order."""
    blocks: list[str] = []
    for key, value in tables.items():
        if isinstance(value, list):
            for each in value:
                blocks += _blocks(f"[[{_key(key)}]]", _key(key), each)
        else:
            blocks += _blocks(f"[{_key(key)}]", _key(key), value)
    return "\n\n".join(blocks) + "\n"


def _blocks(heading: str, path: str, table: Mapping[str, Any]) -> Iterator[str]:
    """A table's own lines under its heading, then a block for each table below it that does not fit on a line."""
    lines = [f"{_key(key)} = {_value(value)}" for key, value in table.items() if not _needs_heading(value)]
    below = {key: value for key, value in table.items() if _needs_heading(value)}
    if lines or not below or heading.startswith("[["):
        yield "\n".join([heading, *lines])
    for key, value in below.items():
        inner = f"{path}.{_key(key)}"
        yield from _blocks(f"[{inner}]", inner, value)


def _needs_heading(value: Any) -> bool:
    if not isinstance(value, Mapping):
        return False
    return any(isinstance(each, Mapping) for each in value.values()) or len(_value(value)) > LONGEST_LINE


def _value(value: Any) -> str:
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{_key(key)} = {_value(each)}" for key, each in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_value(each) for each in value) + "]"
    if isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
        return str(int(value))
    return _scalar(value)


def _key(key: str) -> str:
    return key if BARE.fullmatch(key) else _scalar(key)


def _scalar(value: Any) -> str:
    """A text, number or truth value as TOML writes it."""
    import tomli_w

    return tomli_w.dumps({"x": value}).removeprefix("x = ").rstrip("\n")
