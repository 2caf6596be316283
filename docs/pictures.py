"""Pictures of the program for the guide: screens at 80x24 and printed answers, all of the demo on its fixed morning."""

from __future__ import annotations

import asyncio
import html
import io
import os
import re
import shlex
import tempfile
import textwrap
from collections.abc import Iterable, Iterator, Mapping
from contextlib import chdir, contextmanager, redirect_stderr, redirect_stdout
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from types import SimpleNamespace
from typing import Any
from unittest.mock import patch

from fertui.cli.main import run_command
from fertui.workbench import open_site
from fertui.workbench.demo import build_demo

MORNING = datetime(2026, 6, 1, 6, 30, tzinfo=UTC)
SIZE = (80, 24)
PATIENCE = 120.0
"""Seconds after which a screen that does not come is a failure."""

SCREENS: Mapping[str, tuple[str, ...]] = {
    "all loops": (),
    "today": ("v",),
    "round": ("r", *"2.6", "enter", *"5.5", "enter", *"20", "enter", *"38", "enter", *"4.0", "enter"),
    "analysis": ("escape", "2"),
    "plan": ("6",),
    "logbook": ("7",),
    "correction": ("down", "c"),
    "hand doses": ("escape", "6", "n"),
}
"""Screens by name, each with the keys that lead to it from the one before."""

WATER_REPORT = (
    "EC 0.61, pH 7.4, Ca 76 mg/L, Mg 12 mg/L, K 4 mg/L, Na 28 mg/L, NO3-N 2.8 mg/L, Cl 39 mg/L, SO4 67 mg/L, "
    "CaCO3 163 mg/L"
)
NFT_ANSWERS = ("lettuce", "180", "shared-tank", "none", "0.7 m3", "well", WATER_REPORT, "", "", "nft", "", "")
PEPPER_ANSWERS = ("sweet-pepper", "", "800", "drain-blend", "peat", "", "", "", "rain", "", "", "pepper", "", "")
LAB_REPORT = """\
Sample date;Sample;EC (mS/cm);pH;NH4 [mmol/L];K [mmol/L];Na [mmol/L];Ca [mmol/L];Mg [mmol/L];NO3 [mmol/L];Cl [mmol/L];\
SO4 [mmol/L];HCO3 [mmol/L];P [mmol/L];Fe [umol/L]
31-05-2026;tank;2,7;5,9;0,2;9,8;1,9;6,1;1,4;18,9;1,1;2,0;0,4;1,6;42
"""
"""Invented: a report of the tank of the NFT loop, as a laboratory sends it."""


@dataclass(frozen=True, slots=True)
class Printed:
    """A command and the part of its answer that is shown: from the line that begins so, as many lines (0: all)."""

    command: str
    begins: str = ""
    lines: int = 0


PRINTED: Mapping[str, Printed] = {
    "correct": Printed('fertui supersede demo-site 630 K=4.3 why="misread the report" by=MK'),
    "strike": Printed('fertui void demo-site 628 why="wrong loop" by=MK'),
    "what remains": Printed("fertui logbook demo-site --at 2026-06-01T08:30", "x 628", 3),
    "what replaced it": Printed("fertui logbook demo-site --at 2026-06-01T08:30", "  637", 2),
    "stock sheet": Printed("fertui stock demo-site --at 2026-06-01T08:30", "TANK calcium", 16),
}
"""Printed answers by name."""


def screens(folder: Path, last: str = "") -> tuple[dict[str, str], str]:
    """The text of the screens of ``SCREENS`` as far as ``last``, and Today as SVG; the demo is built in ``folder``."""
    site = build_demo(folder / "demo", now=MORNING)
    with _machine(folder):
        return asyncio.run(_walk(site, last))


async def _walk(site: Path, last: str) -> tuple[dict[str, str], str]:
    from fertui.tui.frame import FertuiApp
    from fertui.tui.settings import Settings
    from fertui.tui.terminal import Terminal

    app = FertuiApp(lambda: open_site(site), site, MORNING, Settings(), Terminal(), "MK")
    texts: dict[str, str] = {}
    drawing = ""
    async with app.run_test(size=SIZE) as pilot:
        for name, keys in SCREENS.items():
            await pilot.press(*keys)
            await _until_still(app, pilot)
            picture = app.export_screenshot(title="fertui", simplify=True)
            texts[name] = text_of(picture)
            drawing = plain_drawing(picture) if name == "today" else drawing
            if name == last:
                break
    return texts, drawing


async def _until_still(app: Any, pilot: Any) -> None:
    """Wait until the model has answered all that the screen asks for."""
    async with asyncio.timeout(PATIENCE):
        while not app.snapshot.loop or app.what_is_going_on():
            await pilot.pause(0.05)
    await pilot.pause()


def text_of(picture: str) -> str:
    """The characters of a screen drawn as SVG, without trailing blanks."""
    rows: dict[int, list[str]] = {}
    cell = float(re.search(r'textLength="([\d.]+)"[^>]*>[^<]</text>', picture)[1])
    for x, row, text in re.findall(r'<text [^>]*? x="([\d.]+)"[^>]*-line-(\d+)\)">([^<]*)</text>', picture):
        characters = html.unescape(text).replace("\xa0", " ")
        line = rows.setdefault(int(row), [" "] * SIZE[0])
        start = round(float(x) / cell)
        line[start : start + len(characters)] = characters
    return "\n".join("".join(rows.get(row, ())).rstrip() for row in range(SIZE[1])).rstrip()


def plain_drawing(picture: str) -> str:
    """An SVG that asks for nothing from elsewhere and does not look like a window of some system."""
    for part in (r"\s*@font-face \{.*?\n    \}", r'\s*<g transform="translate\(26,22\)">.*?</g>', r"\s*<!--.*?-->"):
        picture = re.sub(part, "", picture, flags=re.DOTALL)
    return picture.replace("Fira Code, ", "") + "\n"


@contextmanager
def _machine(folder: Path) -> Iterator[None]:
    """A machine without settings, drafts or initials of its own, whose clock stands in Rome."""
    own = {"HOME": str(folder), "XDG_CONFIG_HOME": str(folder / "config"), "XDG_STATE_HOME": str(folder / "state")}
    with patch.dict(os.environ, {**own, "TZ": "Europe/Rome", "COLUMNS": "80", "FERTUI_OPERATOR": "MK"}):
        yield


def answers() -> dict[str, str]:
    """What ``PRINTED``, the questions of ``fertui new`` and the first days of a new site print, by name."""
    with tempfile.TemporaryDirectory() as folder, _machine(Path(folder)), chdir(folder):
        build_demo(Path("demo-site"), now=MORNING)
        shown = {name: _printed(each.command, each.begins, each.lines) for name, each in PRINTED.items()}
        shown["new nft"] = _asked("fertui new home", NFT_ANSWERS)
        shown["new pepper"] = _asked("fertui new peppers", PEPPER_ANSWERS)
        days = [_printed(command) for command in first_days()]
        shown["first day"] = "\n".join(days[: 2 + ENTRIES_A_DAY])
        Path("lab.csv").write_text(LAB_REPORT, encoding="utf-8")
        shown["first analysis"] = _printed("fertui import home lab.csv --as analysis --by MK")
        shown["first plan"] = _printed("fertui plan home --days 7 --salts 2 --at 2026-06-01T08:30", lines=17)
    return shown


ENTRIES_A_DAY = 4


def first_days() -> Iterator[str]:
    """What is logged at the new NFT loop: the stock it starts with, then three days."""
    mixed = 'left=0 at="2026-05-28 17:00" by=MK'
    salts = '"calcium nitrate double salt=10.5" "potassium nitrate=5"'
    yield f"fertui record home batch tank=calcium litres=100 {salts} {mixed}"
    salts = '"potassium nitrate=4" "monopotassium phosphate=2.7" "magnesium sulfate=2.5"'
    yield f'fertui record home batch tank="sulfate and phosphate" litres=100 {salts} {mixed}'
    for day, ec, water in (("29", "2.6", "260"), ("30", "2.5", "270"), ("31", "2.6", "265")):
        at = f'at="2026-05-{day} 08:00" by=MK'
        yield f"fertui record home reading point=tank EC={ec} pH=6.0 temperature=19.5 {at}"
        yield f"fertui record home water make_up={water} {at}"
        yield f"fertui record home stock tank=calcium litres=2.6 {at}"
        yield f'fertui record home stock tank="sulfate and phosphate" litres=2.6 {at}'


def _printed(command: str, begins: str = "", lines: int = 0) -> str:
    """A command as typed and what it answers, the whole of it or the part that is wanted."""
    with io.StringIO() as kept, redirect_stdout(kept), redirect_stderr(kept):
        run_command(shlex.split(command)[1:])
        answer = [line.rstrip() for line in kept.getvalue().rstrip().splitlines()]
    answer = [line for line in answer if not line.endswith("days ago. Is the date right?")]
    start = next(i for i, line in enumerate(answer) if line.startswith(begins))
    end = start + lines if lines else len(answer)
    shown = [*(["..."] if start else []), *answer[start:end], *(["..."] if end < len(answer) else [])]
    return "\n".join([*_typed(command), *(folded for line in shown for folded in _folded(line))])


def _typed(command: str) -> list[str]:
    """A command as it is typed, on as many lines as it needs."""
    lines = ["$"]
    for word in re.findall(r'(?:[^\s"]|"[^"]*")+', command):
        if len(lines[-1]) + len(word) > SIZE[0] - 4:
            lines[-1] += " \\"
            lines.append("   ")
        lines[-1] += f" {word}"
    return lines


def _folded(line: str) -> list[str]:
    return (
        textwrap.wrap(line, SIZE[0], subsequent_indent="      ", break_on_hyphens=False)
        if len(line) > SIZE[0]
        else [line]
    )


def _asked(command: str, said: Iterable[str]) -> str:
    """The questions of a new site, with the answers typed."""
    waiting = iter(said)

    def type_answer(prompt: str = "") -> str:
        answer = next(waiting)
        print(prompt + answer)
        return answer

    with patch("builtins.input", type_answer), patch("sys.stdin", SimpleNamespace(isatty=lambda: True)):
        return _printed(command)
