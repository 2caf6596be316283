"""The check of a site: its file, its logbook, what to look at, and the machine it runs on, as rows."""

from __future__ import annotations

import locale
import os
import shutil
import sqlite3
import sys
from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from fertui.estimate.notices.notice import Notice
    from fertui.site.model import Water
    from fertui.workbench.folder import SiteFolder

LEAST_FREE_MB = 100
NAME_IT = "name its source water and analysis"


class CheckRow(NamedTuple):
    """One thing looked at: what, what was found, whether it is all right, and what to do where it is not.

    ``severity``: act, watch or note; '' for what is all right.
    """

    group: str
    what: str
    found: str
    passed: bool
    remark: str = ""
    severity: str = ""

    @property
    def sign(self) -> str:
        """How it stands: the sign of its severity, or ok."""
        from fertui.estimate.signs import SIGNS

        return SIGNS.get(self.severity, "ok" if self.passed else SIGNS["act"])


def check(folder: SiteFolder, watch: Mapping[str, Sequence[Notice]]) -> tuple[CheckRow, ...]:
    """All rows, site first. A site file that cannot be read raises as ever.

    ``watch``: what to look at by loop, {} before anything is logged.
    """
    return (*_site(folder), *_logbook(folder), *_watch(watch), *_machine(folder))


def _site(folder: SiteFolder) -> Iterator[CheckRow]:
    site = folder.site
    loops = ", ".join(loop.name for loop in site.loops)
    yield CheckRow("site", "site.toml", f"loops {loops}; {len(site.supplies)} supplies", True)
    for loop in site.loops:
        if loop.layout != "known-feed" and not loop.water:
            yield CheckRow("site", f"water of {loop.name}", "not named", False, NAME_IT, "watch")
    for water in site.waters:
        yield from water_rows(water)


def water_rows(water: Water) -> Iterator[CheckRow]:
    """Whether the report of a water can be used as it is: its charge balance where it says enough, its ions against EC.

    A report of a few ions cannot close its charges, but even a few must not make more EC than was measured.
    """
    from fertui.chemistry.verdicts import EC_RATIO, STANDARD_METHODS, verdicts

    held = water.composition
    is_whole = bool(held.ions.get("Ca")) and "HCO3" in held.ions
    for row in verdicts(held.ions, held.ec, held.ph):
        too_much = row.what.startswith("EC") and row.value > EC_RATIO[1]
        if row.source != STANDARD_METHODS and (is_whole or too_much):
            remark = f"{row.remark}; look at its units"
            severity = "" if row.passed else "watch"
            yield CheckRow("site", f"water {water.name}, {row.what}", row.found, row.passed, remark, severity)


def _logbook(folder: SiteFolder) -> Iterator[CheckRow]:
    from fertui.logbook.integrity import check_book

    for row in check_book(folder.book.path):
        yield CheckRow("logbook", row.what, row.found, row.passed, row.remark)


def _watch(watch: Mapping[str, Sequence[Notice]]) -> Iterator[CheckRow]:
    if not watch:
        yield CheckRow("watch list", "empty", "Nothing is logged yet; an analysis of loop and water come first.", True)
        return
    for name, notices in watch.items():
        for notice in notices:
            yield CheckRow(f"watch {name}", notice.code, notice.text, notice.severity == "note", "", notice.severity)


def _machine(folder: SiteFolder) -> Iterator[CheckRow]:
    free = shutil.disk_usage(folder.folder).free // 2**20
    yield CheckRow("machine", "disk", f"{free} MB free", free > LEAST_FREE_MB, "make room before logging on")
    encoding = locale.getpreferredencoding(False)
    yield CheckRow("machine", "locale", encoding, True, "" if "UTF" in encoding.upper() else "screens use plain ASCII")
    terminal = os.environ.get("TERM", "")
    usable = terminal not in ("", "dumb")
    yield CheckRow("machine", "terminal", terminal or "none", True, "" if usable else "use the plain commands here")
    yield CheckRow("machine", "database", f"SQLite {sqlite3.sqlite_version}", sqlite3.sqlite_version_info >= (3, 37))
    yield CheckRow("machine", "python", sys.version.split()[0], sys.version_info >= (3, 11))
