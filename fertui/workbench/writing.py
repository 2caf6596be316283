"""What is written down: entries, corrections, tables, plans carried out, the site file."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from fertui.logbook.entries import Entry
from fertui.workbench.answers import GLANCED, Answers
from fertui.workbench.clock import now

if TYPE_CHECKING:
    from fertui.chemistry.verdicts import Check
    from fertui.logbook.importing import ImportResult
    from fertui.logbook.questions import Question
    from fertui.planning.values import Plan
    from fertui.workbench.carrying_out import PlanItem
    from fertui.workbench.entering import LastValue, Place


class Writing(Answers):
    """Every write of the workbench."""

    def echo(self, kind: str, name: str, text: str, loop: str | None = None) -> str:
        """What was understood of one value; refuses what cannot be taken."""
        from fertui.workbench.entering import echo

        return echo(kind, name, text, self.site, self.loop(loop))

    def previous(self, loop: str | None = None, at: datetime | None = None) -> Mapping[Place, LastValue]:
        """The last value for every place a form asks for."""
        from fertui.workbench.entering import previous

        chosen, at = self.loop(loop).name, at or now()
        since = at - GLANCED
        recent = self.book.entries(loop=chosen, since=since, at=at)
        old = (entry for entry in self._in_force(recent, since) if entry.loop == chosen)
        return previous((*old, *recent))

    def questions(self, kind: str, fields: Mapping[str, str], loop: str | None = None) -> tuple[Question, ...]:
        """What a careful colleague would ask before this entry is written."""
        return self._questions(self._read(kind, fields, loop, whole=False))

    def check_analysis(self, fields: Mapping[str, str], loop: str | None = None) -> tuple[Check, ...]:
        """Charge balance and EC check of an analysis before it is saved."""
        from fertui.workbench.entering import check_analysis

        return check_analysis(self._read("analysis", fields, loop, whole=False))

    def record(self, kind: str, fields: Mapping[str, str], loop: str | None = None, asked: bool = True) -> Entry:
        """Append one entry, return it as read back; ``asked`` False: unanswered questions are kept with it as flags."""
        from fertui.logbook.questions import flagged

        entry = self._read(kind, fields, loop)
        if not asked:
            entry = flagged(entry, self._questions(entry))
        return self._stored(self.book.append(entry))

    def record_all(self, lines: Sequence[tuple[str, Mapping[str, str]]], loop: str | None = None) -> tuple[Entry, ...]:
        """Append several entries of a loop in one transaction, all or none; kinds and texts as in ``record``."""
        entries = [self._read(kind, fields, loop) for kind, fields in lines]
        return tuple(self.book.entry(number) for number in self.book.append(entries))

    def supersede(self, number: int, fields: Mapping[str, str], why: str, by: str, asked: bool = True) -> Entry:
        """Correct an entry by a new one; the old one stays visible. ``asked`` as in ``record``."""
        from fertui.logbook.questions import flagged

        entry = self._corrected(number, fields, why, by)
        if not asked:
            entry = flagged(entry, self._questions(entry))
        return self._stored(self.book.append(entry))

    def questions_of_correction(
        self, number: int, fields: Mapping[str, str], why: str, by: str
    ) -> tuple[Question, ...]:
        """What is odd about an entry as it would be after a correction."""
        return self._questions(self._corrected(number, fields, why, by))

    def _corrected(self, number: int, fields: Mapping[str, str], why: str, by: str) -> Entry:
        from fertui.logbook.parse import corrected

        return corrected(self.book.entry(number), fields, self.site, datetime.now(UTC), why=why, by=by)

    def void(self, number: int, why: str, by: str) -> Entry:
        """Strike an entry; it stays visible."""
        from fertui.logbook.signing import initials

        return self._stored((self.book.void(number, why, initials(by)),))

    def import_table(self, path: Path, kind: str, loop: str | None = None, **wishes: Any) -> ImportResult:
        """Take in a table; ``wishes`` as in ``keeping.import_table``."""
        from fertui.workbench.keeping import import_table

        return import_table(self, path, kind, loop, **wishes)

    def export(self, into: Path) -> tuple[Path, ...]:
        """Write the logbook as tables, one a kind."""
        from fertui.logbook.exporting import export

        return export(self.book, into, self.site.timezone)

    def backup(self, path: Path) -> Path:
        """Write the whole book and the site file, verbatim."""
        from fertui.logbook.backup import backup

        return backup(self.folder, path)

    def change_site(self, key: str, text: str, by: str) -> Entry:
        """Change one value of the site file as it is now, keep the old file, and log the new one whole."""
        from fertui.logbook.signing import initials
        from fertui.site.edit import changed, rows
        from fertui.site.files import write_site

        before = self.read_site_again()
        old = next((row.text for row in rows(before) if row.key == key), "")
        site = changed(before, key, text, source=f"{initials(by)}, {now():%Y-%m-%d}")
        path = write_site(site, self.folder, datetime.now(UTC))
        self.__dict__.pop("site", None)
        words = {"text": path.read_text(encoding="utf-8"), "note": f"{key}: {old or 'nothing'} -> {text or 'nothing'}"}
        return self.record("site", {**words, "by": by})

    def accept_plan(self, plan: Plan, by: str) -> tuple[Entry, ...]:
        """Log what is intended: one plan entry a step, all or none."""
        from fertui.workbench.carrying_out import steps_of

        entries = [self._read("plan", fields, plan.loop) for fields in steps_of(plan, by)]
        return tuple(self.book.entry(number) for number in self.book.append(entries))

    def open_plans(self, loop: str | None = None, at: datetime | None = None) -> tuple[PlanItem, ...]:
        """Intended steps of a loop, done or not."""
        from fertui.workbench.carrying_out import open_plans

        return open_plans(self.book.entries(loop=self.loop(loop).name, at=at))

    def mark_done(
        self, number: int, by: str, amount: str | None = None, strength_pct: float | None = None, read: bool = False
    ) -> Entry:
        """Log a planned step as carried out, wholly or by ``amount``; ``read``: its cautions were acknowledged."""
        from fertui.workbench.carrying_out import done_fields

        planned = self.book.entry(number)
        kind, fields = done_fields(planned, by, amount, strength_pct)
        if kind == "acid":
            fields["cautions"] = "acknowledged" if read else "not acknowledged"
        return self.record(kind, fields, planned.loop)

    def not_done(self, number: int, why: str, by: str) -> Entry:
        """Strike an intended step that will not be carried out."""
        return self.void(number, why, by)

    def _read(self, kind: str, fields: Mapping[str, str], loop: str | None, whole: bool = True) -> Entry:
        """The entry that texts describe; acid logged by any way says whether its cautions were acknowledged."""
        from fertui.logbook.parse import entry_from_text

        if kind == "acid":
            fields = {"cautions": "not acknowledged", **fields}
        return entry_from_text(kind, fields, self.site, self.loop(loop), datetime.now(UTC), whole=whole)

    def _questions(self, entry: Entry) -> tuple[Question, ...]:
        from fertui.logbook.questions import questions
        from fertui.workbench.pairs import pairs

        return (*questions(entry, self.book, self.site), *pairs(entry, self.book, self.site))

    def _stored(self, numbers: Sequence[int]) -> Entry:
        return self.book.entry(numbers[-1])
