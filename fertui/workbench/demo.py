"""The demo: the invented site of ``greenhouse_demo``, built with its last morning today."""

from __future__ import annotations

import shlex
import shutil
import tempfile
from collections.abc import Iterator
from datetime import UTC, date, datetime, time, timedelta, tzinfo
from pathlib import Path

from fertui.logbook.entries import Entry
from fertui.refusals import FileTrouble, Refusal
from fertui.site.model import Site

LAST_ROUND = time(8, 0)
"""After this, on the clock of the demo site, the last logged morning is today's; before, it is yesterday's."""


def demo_texts() -> Path:
    """The folder with the demo's texts: inside an installed package, or beside it in a checkout."""
    package = Path(__file__).resolve().parent.parent
    for folder in (package / "greenhouse_demo", package.parent / "greenhouse_demo"):
        if (folder / "logbook.txt").is_file():
            return folder
    raise FileTrouble("the texts of the demo are missing from this installation; install fertui again.")


def build_demo(into: Path | None = None, now: datetime | None = None) -> Path:
    """Build the demo site in a folder (default: a fresh temporary one) and return it.

    Raises ``Refusal`` where the folder holds something already.
    """
    from fertui.logbook.store import Logbook
    from fertui.site.files import read_site
    from fertui.workbench.folder import LOGBOOK

    now = now or datetime.now(UTC)
    folder = Path(tempfile.mkdtemp(prefix="fertui-demo-")) if into is None else into
    if folder.exists() and any(folder.iterdir()):
        raise Refusal(f"{folder} is not empty; name a new folder for the demo.")
    folder.mkdir(parents=True, exist_ok=True)
    texts = demo_texts()
    shutil.copyfile(texts / "site.toml", folder / "site.toml")
    site = read_site(folder)
    with Logbook.create(folder / LOGBOOK) as book:
        book.append(sorted(_entries(texts / "logbook.txt", site, now), key=lambda entry: entry.entered))
    return folder


def _entries(path: Path, site: Site, now: datetime) -> Iterator[Entry]:
    from fertui.logbook.parse import entry_from_text
    from fertui.logbook.times import zone

    here = zone(site.timezone)
    local = now.astimezone(here)
    last = local.date() if local.time() >= LAST_ROUND else local.date() - timedelta(days=1)
    for line in path.read_text(encoding="utf-8").splitlines():
        if line.startswith("#") or not line.strip():
            continue
        day, clock, loop, kind, *words = shlex.split(line)
        fields = dict(word.partition("=")[::2] for word in words)
        written = fields.pop("entered", None)
        at, whole_day = _moment(last, int(day), clock, here), clock == "day"
        entered = _entered(last, written, here) if written else at + timedelta(days=1, hours=8) if whole_day else at
        fields["at"] = f"{(last + timedelta(days=int(day))).isoformat()}{'' if whole_day else ' ' + clock}"
        entry = entry_from_text(kind, fields, site, loop, max(now, entered))
        yield entry._replace(entered=min(entered + timedelta(minutes=3), now).astimezone(UTC))


def _moment(last: date, day: int, clock: str, here: tzinfo) -> datetime:
    hour = time(0, 0) if clock == "day" else time.fromisoformat(clock)
    return datetime.combine(last + timedelta(days=day), hour, here)


def _entered(last: date, written: str, here: tzinfo) -> datetime:
    day, _, clock = written.partition("@")
    return _moment(last, int(day), clock, here)
