"""Writes what the docs take from the program itself: ``python docs/make.py``. The suite fails when they have drifted."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from pathlib import Path

from fertui.catalogue.safety_page import safety_tables
from fertui.cli.parser import build, commands_of
from fertui.logbook.kinds import KINDS

DOCS = Path(__file__).parent


def command_reference() -> str:
    """docs/command.md: every command with its options, then every kind of entry with its values."""
    tree = build()
    parts = ["# Commands", "", "Made from the program by `docs/make.py`.", "", *_block(tree.format_help())]
    for name, parser in commands_of(tree).items():
        parts += [f"## fertui {name}", "", *_block(parser.format_help())]
    return "\n".join([*parts, *_kinds()])


def _block(text: str) -> list[str]:
    return ["```", *(line.rstrip() for line in text.rstrip().splitlines()), "```", ""]


def _kinds() -> list[str]:
    lines = ["## Kinds of entry", "", "Values of `fertui record SITE KIND name=value ...`; every kind also takes"]
    lines += ["`at=`, `by=`, `point=`, `zone=`, `method=`, `instrument=`, `note=` and `doubtful=`.", ""]
    for kind in KINDS.values():
        lines += [f"### {kind.name}", "", kind.about.capitalize() + ".", "", "| value | unit | about |", "|---|---|---|"]
        for field in kind.fields:
            words = " or ".join(field.words)
            about = "; ".join(part for part in (field.about, words, "needed" if field.required else "") if part)
            lines.append(f"| {field.name} | {field.unit} | {about} |")
        if kind.salts:
            lines.append("| any supply or salt | kg | one value for each |")
        lines.append("")
    return lines


def safety_page() -> str:
    """docs/safety.md with its tables made anew from the cautions of the catalogue."""
    return replaced((DOCS / "safety.md").read_text(encoding="utf-8"), "safety", safety_tables())


PAGES: Mapping[str, Callable[[], str]] = {"command.md": command_reference, "safety.md": safety_page}
"""Pages made from the program, whole or in part."""


def replaced(page: str, name: str, made: str) -> str:
    """A page with the block between ``<!-- made: name -->`` and ``<!-- end -->`` replaced."""
    pattern = re.compile(rf"(<!-- made: {re.escape(name)} -->\n).*?(<!-- end -->)", re.DOTALL)
    return pattern.sub(lambda found: f"{found[1]}{made.rstrip()}\n{found[2]}", page)


if __name__ == "__main__":
    for file_name, page in PAGES.items():
        (DOCS / file_name).write_text(page(), encoding="utf-8")
