"""Keeping the book: tables in and out, backup and restore, new sites."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

from fertui.refusals import FileTrouble, Refusal

if TYPE_CHECKING:
    from fertui.logbook.importing import ImportResult
    from fertui.site.questions import Question
    from fertui.workbench.folder import SiteFolder


def import_table(
    bench: SiteFolder,
    path: Path,
    kind: str,
    loop: str | None = None,
    dry_run: bool = False,
    by: str | None = None,
    template: str | None = None,
    save_template: str | None = None,
) -> ImportResult:
    """Take in a table of one kind, with the column mapping of a laboratory where one is named."""
    from datetime import UTC, datetime

    from fertui.logbook import importing, templates

    mapping = None if template is None else templates.read_template(bench.folder, template)
    result = importing.import_table(
        path, kind, bench.book, bench.site, datetime.now(UTC), by=by or "", loop=loop, template=mapping, dry_run=dry_run
    )
    if save_template is not None:
        templates.save_template(bench.folder, save_template, result.template)
    return result


def write_new(path: Path, text: str) -> Path:
    """Write a text file that is not there yet; refuse to overwrite."""
    try:
        with path.open("x", encoding="utf-8") as file:
            file.write(text if text.endswith("\n") else text + "\n")
    except FileExistsError:
        raise Refusal(f"{path} is there already; name another file, or move that one away.") from None
    except OSError as trouble:
        raise FileTrouble(f"{path} cannot be written: {trouble.strerror}. Name a folder you may write to.") from trouble
    return path


def make_new_site(folder: Path, answers: Mapping[str, str]) -> tuple[Path, tuple[str, ...]]:
    """Make a site folder with an empty logbook from answers as texts; returns the folder and what to do first.

    A report of its water that does not hold together is said before all else.
    """
    from fertui.logbook.store import Logbook
    from fertui.site.new import first_steps
    from fertui.site.questions import new_site_from
    from fertui.workbench.checks import water_rows
    from fertui.workbench.folder import LOGBOOK

    site = new_site_from(folder, answers)
    Logbook.create(folder / LOGBOOK).close()
    doubted = [row for water in site.waters for row in water_rows(water) if not row.passed]
    doubts = (f"Look at {row.what} again: {row.found}; {row.remark}." for row in doubted)
    return folder, (*doubts, *first_steps(site))


def refuse_place(folder: Path) -> None:
    """Raises ``SiteError`` where no site can be made in a folder, so that nobody answers questions for nothing."""
    from fertui.site.new import refuse_place as refuse

    refuse(folder)


def new_site_questions() -> tuple[Question, ...]:
    """What a new site is asked, in the order a grower knows the answers."""
    from fertui.site.questions import questions

    return questions()


def restore_site(path: Path, folder: Path) -> Path:
    """Make a site folder from a backup."""
    from fertui.logbook.backup import restore

    return restore(path, folder)
