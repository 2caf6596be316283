"""Writing into the logbook: forms, corrections, striking, drafts, and whose initials it is under."""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, datetime
from functools import cached_property, partial
from typing import TYPE_CHECKING

from fertui.logbook.signing import ALLOWED
from fertui.refusals import Refusal
from fertui.tui.desk import Answer
from fertui.tui.drafts import Draft, Drafts
from fertui.tui.working import Working

if TYPE_CHECKING:
    from fertui.logbook.entries import Entry


class Entering(Working):
    """What has happened is logged from any view."""

    acknowledged = False
    """Whether cautions of acids were read and their label checked in this session."""

    @cached_property
    def drafts(self) -> Drafts:
        """Half-filled forms of this site."""
        return Drafts(self.folder)

    async def action_enter(self, kind: str) -> None:
        """Open the form of a kind, and first offer what was half filled in."""
        if self.snapshot.site is None:
            return
        from fertui.tui.forms.form import Form
        from fertui.tui.forms.kinds import form_for
        from fertui.tui.forms.offer import offer

        site, loop = self.snapshot.site, self.snapshot.loop
        form = Form(partial(form_for, kind, site, site.loop(loop)), self.snapshot.unit, loop)
        draft = self.drafts.find(form.spec.kind, loop)
        await self.open_page(form)
        if draft is not None:
            await self.open_page(offer(draft, form, datetime.now(UTC)))

    async def action_entries(self) -> None:
        """List the kinds that have no key of their own."""
        from fertui.tui.chooser import Chooser, Option
        from fertui.tui.forms.kinds import OTHER_KINDS

        options = [Option(kind, about) for kind, about in OTHER_KINDS.items()]
        await self.open_page(
            Chooser("What has happened?", options, lambda kind: self.call_next(self.action_enter, kind))
        )

    async def correct(self, entry: Entry) -> None:
        """Open the form that corrects an entry."""
        from fertui.tui.forms.correction import Correction

        if entry.kind == "site":
            self.say("A changed site is corrected in the Site view (9).", "watch")
        elif entry.void:
            self.say("This line only strikes another; log the event anew.", "watch")
        else:
            await self.open_page(Correction(entry))

    def strike(self, entry: Entry) -> None:
        """Ask why, and strike an entry."""
        number = entry.number or 0

        def because(why: str) -> None:
            if not why:
                self.say("Nothing was struck: a reason is needed.", "watch")
                return
            self.with_initials(lambda by: self.clerk(lambda bench: bench.void(number, why, by), self.wrote, "striking"))

        self.ask(f"Why strike entry {number}?", because)

    def wrote(self, answer: Answer) -> None:
        """An entry was written, or not: say so, and have everything worked out again."""
        if answer.value is None:
            self.say_at_length("Nothing was logged", answer.trouble)
            return
        from fertui.logbook.entries import Entry

        entries = (answer.value,) if isinstance(answer.value, Entry) else answer.value
        self.changed(max(entry.number or 0 for entry in entries))
        self.say("logged as " + ", ".join(str(entry.number) for entry in entries), "good")

    def keep_draft(self, kind: str, loop: str, texts: tuple[str, ...]) -> bool:
        """Keep a half-filled form; False where the folder takes no file."""
        return self.drafts.keep(kind, loop, Draft(self.initials.now, datetime.now(UTC), texts, self.snapshot.unit))

    def drop_draft(self, kind: str, loop: str) -> None:
        """The form was saved or is not wanted."""
        self.drafts.drop(kind, loop)

    def with_initials(self, then: Callable[[str], None]) -> None:
        """Go on with the initials of whoever is at the keyboard, asked for where they are not known."""
        if self.initials.now:
            then(self.initials.now)
            return

        def given(text: str) -> None:
            try:
                initials = self.initials.give(text)
            except Refusal:
                self.ask(f"Initials are {ALLOWED}:", given)
                return
            self.snapshot = self.snapshot._replace(initials=initials)
            then(initials)

        self.ask("Your initials:", given)
