"""Writes what the docs take from the program: ``python docs/make.py``. The suite fails when they have drifted."""

from __future__ import annotations

import re
import tempfile
from collections.abc import Callable, Mapping
from datetime import UTC, datetime
from pathlib import Path

from pictures import answers, screens

from fertui.catalogue.safety_page import safety_tables
from fertui.cli.parser import build, commands_of
from fertui.logbook.kinds import KINDS
from fertui.workbench import open_site
from fertui.workbench.demo import build_demo

DOCS = Path(__file__).parent
README = DOCS.parent / "README.md"
DEMO_MORNING = datetime(2026, 6, 1, 6, 30, tzinfo=UTC)


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
        lines += [
            f"### {kind.name}",
            "",
            kind.about.capitalize() + ".",
            "",
            "| value | unit | about |",
            "|---|---|---|",
        ]
        for field in kind.fields:
            words = " or ".join(field.words)
            about = "; ".join(part for part in (field.about, words, "needed" if field.required else "") if part)
            unit = "a time" if field.what == "time" else field.unit
            lines.append(f"| {field.name} | {unit} | {about} |")
        if kind.salts:
            lines.append("| any supply or salt | kg | one value for each |")
        lines.append("")
    return lines


def safety_page() -> str:
    """docs/safety.md with its tables made anew from the cautions of the catalogue."""
    return replaced((DOCS / "safety.md").read_text(encoding="utf-8"), "safety", safety_tables())


def readme_page() -> str:
    """README.md with today and a plan as the demo gives them on a fixed morning."""
    from fertui.cli.views import plan, today
    from fertui.workbench.carrying_out import acids_of

    with tempfile.TemporaryDirectory() as folder:
        bench = open_site(build_demo(Path(folder) / "demo", now=DEMO_MORNING))
        state = bench.today("north bay", DEMO_MORNING)
        made = bench.plan("north bay", at=DEMO_MORNING)
        shown = today.text(state, bench.site.timezone, "mmol/L")
        planned = plan.text(made, bench.site.timezone, "mmol/L", acids_of(made))
    page = README.read_text(encoding="utf-8")
    page = replaced(page, "today", "\n".join(_block(shown)))
    return replaced(page, "plan", "\n".join(_block(_beginning(planned))))


def _beginning(planned: str) -> str:
    """The answer of a plan, its first caution and what to do; sums and reasons the README does not need whole."""
    answer, mark, rest = planned.partition("READ BEFORE YOU START")
    first = rest.split("\n!!")
    todo = rest.partition("\n\n")[2].partition("\n\nLimits that bind")[0]
    return f"{answer}{mark}{first[0]}\n!!{first[1]}\n...\n\n{todo}\n..."


def guide_with_answers() -> str:
    """docs/guide.md with what its commands print made anew."""
    return _guide(answers())


def guide_with_screens() -> str:
    """docs/guide.md with its screens made anew."""
    with tempfile.TemporaryDirectory() as folder:
        return _guide(screens(Path(folder))[0])


def today_drawn() -> str:
    """docs/today.svg: Today of the demo's slab loop."""
    with tempfile.TemporaryDirectory() as folder:
        return screens(Path(folder), last="today")[1]


def _guide(pictures: Mapping[str, str]) -> str:
    page = (DOCS / "guide.md").read_text(encoding="utf-8")
    for name, picture in pictures.items():
        page = replaced(page, name, f"```\n{picture}\n```")
    return page


PAGES: Mapping[Path, Callable[[], str]] = {
    DOCS / "command.md": command_reference,
    DOCS / "safety.md": safety_page,
    README: readme_page,
    DOCS / "guide.md": guide_with_answers,
}
"""Pages made from the program, whole or in part."""

DRAWN: Mapping[Path, Callable[[], str]] = {
    DOCS / "guide.md": guide_with_screens,
    DOCS / "today.svg": today_drawn,
}
"""What is taken from the screens, which takes longer."""


def replaced(page: str, name: str, made: str) -> str:
    """A page with the block between ``<!-- made: name -->`` and ``<!-- end -->`` replaced."""
    pattern = re.compile(rf"(<!-- made: {re.escape(name)} -->\n).*?(<!-- end -->)", re.DOTALL)
    return pattern.sub(lambda found: f"{found[1]}{made.rstrip()}\n{found[2]}", page)


if __name__ == "__main__":
    for path, page in (*PAGES.items(), *DRAWN.items()):
        path.write_text(page(), encoding="utf-8")
