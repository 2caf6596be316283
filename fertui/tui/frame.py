"""The terminal interface: a frame of four parts, nine views, and one snapshot that all of them show."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from datetime import UTC, datetime
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any, ClassVar, cast

from textual import events
from textual.app import App, ComposeResult
from textual.binding import Binding
from textual.geometry import Region, Size
from textual.reactive import var
from textual.screen import Screen

from fertui.refusals import FileTrouble, Refusal
from fertui.tui import leaving
from fertui.tui.actions import action_list
from fertui.tui.asking import QUICK, call_for, progress
from fertui.tui.desk import Answer, Call, Came, Desk
from fertui.tui.drafts import Draft, Drafts
from fertui.tui.driver import LineGone, Resumed, ThinLineDriver
from fertui.tui.faults import fault_sentence
from fertui.tui.forms.offer import offer
from fertui.tui.header_line import HeaderLine
from fertui.tui.help import HelpPage
from fertui.tui.initials import Initials
from fertui.tui.key_line import KeyLine, key_name
from fertui.tui.keys import GLOBAL_KEYS, VIEW_NAMES
from fertui.tui.prompt import Prompt
from fertui.tui.releasing import release
from fertui.tui.settings import Settings, write_settings
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.stage import Stage
from fertui.tui.terminal import FLOOR, Terminal
from fertui.tui.text_page import TextPage
from fertui.tui.themes import NAMES, THEMES, usual_theme
from fertui.tui.view import View
from fertui.tui.view_line import ViewLine
from fertui.tui.views import view_numbered

if TYPE_CHECKING:
    from fertui.logbook.entries import Entry
    from fertui.site.model import Site
    from fertui.workbench import Bench

PAPERS = {
    "round_sheet": "blank round sheet with the last values", "handover": "one page for the next shift", "stock": "stock-tank sheet",
    "acid": "acid sheet for the make-up water", "report": "report for consultant or inspector, last 14 days",
}  # fmt: skip
"""Sheets by the workbench's name for them."""
LOOK_FOR_NEWS_EVERY = 2.0
"""Seconds between looks at the logbook for what other sessions wrote."""


class Frame(Screen[None], inherit_bindings=False):
    """The one screen: header, view names, stage, keys."""

    def compose(self) -> ComposeResult:
        """The four parts from top to bottom."""
        yield HeaderLine()
        yield ViewLine()
        yield Stage()
        yield KeyLine()
        yield Prompt()

    async def on_mount(self) -> None:
        """The parts stand: begin."""
        await cast("FertuiApp", self.app).begin()

    def on_resize(self) -> None:
        """A new size: nothing of what the terminal shows is known."""
        cast("FertuiApp", self.app).forget_screen()


class FertuiApp(App[int], inherit_bindings=False):
    """Shows one site. Work goes to two desks: one that runs the model, one for what must not wait for it."""

    CSS_PATH = "app.tcss"
    ENABLE_COMMAND_PALETTE = False
    BINDINGS: ClassVar[list[Any]] = GLOBAL_KEYS

    snapshot: var[Snapshot] = var(Snapshot, init=False)

    def __init__(
        self,
        open_bench: Callable[[], Bench],
        folder: Path,
        at: datetime | None,
        settings: Settings,
        terminal: Terminal,
        operator: str = "",
    ) -> None:
        super().__init__(driver_class=ThinLineDriver)
        self.terminal, self.settings, self.folder = terminal, settings, folder
        self.drafts = Drafts(folder)
        self.initials = Initials(operator, settings.initials_minutes)
        self.fixed_at = at
        self.moment = at or datetime.now(UTC)
        self.fault: BaseException | None = None
        self.acknowledged = False
        self.open_view = 1
        self._notice = ("", "faint")
        self._model = Desk("model", open_bench, self.post_message)
        self._clerk = Desk("clerk", open_bench, self.post_message)
        self._under_way: dict[Ask, Call] = {}
        self._last_number = -1
        for theme in THEMES:
            self.register_theme(theme)
        self.theme = settings.theme or usual_theme(terminal.colours)
        self.animation_level = "none"
        self.set_keymap(dict(settings.keys))

    def get_default_screen(self) -> Screen[None]:
        """The frame."""
        return Frame()

    async def begin(self) -> None:
        """Show the frame at once; numbers follow when the desks have them."""
        leaving.on_signals(self._leave_at_once)
        await self.action_view(1)
        self.set_interval(LOOK_FOR_NEWS_EVERY, self._look_for_news)
        self.clerk(lambda bench: (bench.site, bench.loops, bench.last_number()), self._opened)

    def _opened(self, answer: Answer) -> None:
        if answer.value is None:
            self.say(answer.trouble, "act")
            return
        site, loops, self._last_number = answer.value
        unit = self.settings.unit or site.units
        self.snapshot = replace(self.snapshot, site=site, loops=loops, loop=loops[0], unit=unit)

    # the snapshot and what it lacks

    def watch_snapshot(self) -> None:
        """A new snapshot: draw it, and have worked out what it lacks."""
        self.draw_frame()
        if self.page is not None:
            self.page.redraw()
        self.work_out()

    def work_out(self) -> None:
        """Put to the desks what the open page needs and does not have; what no page needs any more is not begun."""
        if self.page is None or not self.snapshot.loop:
            return
        missing = [ask for ask in self.page.asks(self.snapshot) if self.snapshot.lacks(ask)]
        self._drop([ask for ask in self._under_way if ask not in missing])
        for ask in missing:
            if ask not in self._under_way:
                call = call_for(ask, self.moment, partial(self._answered, self._last_number))
                self._under_way[ask] = call
                (self._clerk if ask.use_case in QUICK else self._model).put(call)
        self.update_keys()

    def _drop(self, asks: list[Ask]) -> None:
        """Take calls back that have not begun."""
        unwanted = [self._under_way[ask] for ask in asks]
        if unwanted:
            waiting = self._model.instead([])
            for call in waiting:
                if call not in unwanted:
                    self._model.put(call)
            begun = {ask: call for ask, call in self._under_way.items() if not (call in waiting and call in unwanted)}
            self._under_way = begun

    def _answered(self, known: int, ask: Ask, answer: Answer) -> None:
        self._under_way.pop(ask, None)
        fresh = self.snapshot.with_answer(ask, answer)
        self.snapshot = fresh if known == self._last_number else replace(fresh, stale=fresh.stale | {ask})

    def on_came(self, message: Came) -> None:
        """An answer of a desk: hand it to whoever asked."""
        answer = message.answer
        if answer.fault is not None:
            answer = Answer(trouble=fault_sentence(message.call.name or "the logbook", answer.fault))
        message.call.then(answer)

    def clerk(self, work: Callable[[Bench], Any], then: Callable[[Answer], None], name: str = "") -> None:
        """Have something quick done on the site and hear of it; it never waits for the model."""
        self._clerk.put(Call(work, then, name))

    def _look_for_news(self) -> None:
        if self.initials.now != self.snapshot.initials:
            self.snapshot = replace(self.snapshot, initials=self.initials.now)
        if self.snapshot.loop:
            self.clerk(lambda bench: bench.last_number(), self._news)

    def _news(self, answer: Answer) -> None:
        if answer.value is not None and answer.value != self._last_number:
            self.changed(answer.value)
        elif answer.trouble:
            self.say(answer.trouble, "act")

    def changed(self, last_number: int) -> None:
        """The logbook has new entries: what is shown stays until better answers come."""
        self._last_number = last_number
        self.moment = self.fixed_at or datetime.now(UTC)
        self._model.instead([])
        self._under_way.clear()
        self.snapshot = self.snapshot.outdated()

    # the frame

    @property
    def too_small(self) -> bool:
        """Whether the screen is below the floor for which views are made."""
        return self.size.width < FLOOR[0] or self.size.height < FLOOR[1]

    @property
    def page(self) -> View | None:
        """The page that shows."""
        return self.query_one(Stage).top

    def draw_frame(self) -> None:
        """Header, view names and keys."""
        now = self.snapshot
        self.query_one(HeaderLine).say(self._where(), f"as of {self.local(self.moment):%a %-d %b %H:%M}", now.initials)
        loops = f"loop {now.loops.index(now.loop) + 1}/{len(now.loops)}" if len(now.loops) > 1 else ""
        self.query_one(ViewLine).mark(VIEW_NAMES, self.open_view, loops)
        self.update_keys()

    def _where(self) -> str:
        if self.snapshot.site is None:
            return self.folder.name
        site, loop = self.snapshot.site, self.snapshot.site.loop(self.snapshot.loop)
        grown = ", ".join(word for word in (loop.crop, loop.stage, loop.medium) if word and word != "none")
        return f"{site.name}, {loop.name}: {grown}"

    def local(self, moment: datetime) -> datetime:
        """A moment on the clock of the site."""
        if self.snapshot.site is None:
            return moment.astimezone()
        from zoneinfo import ZoneInfo

        return moment.astimezone(ZoneInfo(self.snapshot.site.timezone))

    async def on_event(self, event: events.Event) -> None:
        """Every key keeps the initials in force and clears the notice."""
        if isinstance(event, events.Key) and not event.is_forwarded:
            self.initials.touch()
            if self._notice[0]:
                self.say("")
        await super().on_event(event)

    def say(self, notice: str, ink: str = "faint") -> None:
        """A notice in the bottom line, until the next key."""
        self._notice = (notice, ink)
        self.update_keys()

    def update_keys(self) -> None:
        """The bottom line: keys of the page and the frame, and what is going on."""
        page = self.page
        if page is None:
            return
        notice, ink = self._notice
        if not notice and self._under_way:
            notice = progress([ask.use_case for ask in self._under_way])
        if not notice and page.below:
            notice = f"{page.below} more below"
        self.query_one(KeyLine).say(self._key_words(page), notice, ink)

    def _key_words(self, page: View) -> list[tuple[str, str]]:
        """Keys to show: those of the page first, each action once."""
        own = {binding.id for bindings in page._bindings.key_to_bindings.values() for binding in bindings}
        shown: dict[str | None, Binding] = {}
        for active in self.screen.active_bindings.values():
            if active.binding.show:
                shown.setdefault(active.binding.id, active.binding)
        ordered = sorted(shown.values(), key=lambda binding: binding.id not in own)
        if self.query_one(Stage).piled:
            ordered = [binding for binding in ordered if binding.id in own]
        return [(key_name(binding.key), binding.description) for binding in ordered]

    # entries

    async def action_enter(self, kind: str) -> None:
        """Open the form of a kind, or first offer what was half filled in."""
        if self.snapshot.site is None:
            return
        from fertui.tui.forms.form import Form
        from fertui.tui.forms.kinds import form_for

        site, loop = self.snapshot.site, self.snapshot.loop
        form = Form(form_for(kind, site, site.loop(loop), self.snapshot.unit), loop)
        draft = self.drafts.find(form.spec.kind, loop)
        await self.open_page(form)
        if draft is not None:
            await self.open_page(offer(draft, form, self.moment))

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
        else:
            await self.open_page(Correction(entry))

    def strike(self, entry: Entry) -> None:
        """Ask why, and strike an entry."""

        def because(why: str) -> None:
            if not why:
                self.say("Nothing was struck: a reason is needed.", "watch")
                return
            self.with_initials(
                lambda by: self.clerk(lambda bench: bench.void(entry.number or 0, why, by), self.wrote, "striking")
            )

        self.ask(f"Why strike entry {entry.number}?", because)

    def wrote(self, answer: Answer) -> None:
        """An entry was written, or not: say so, and have everything worked out again."""
        if answer.value is None:
            self.say(answer.trouble, "act")
            return
        entries = answer.value if isinstance(answer.value, tuple) else (answer.value,)
        self.changed(max(entry.number or 0 for entry in entries))
        self.say("logged as " + ", ".join(str(entry.number) for entry in entries), "good")

    def keep_draft(self, kind: str, loop: str, texts: tuple[str, ...]) -> None:
        """Keep a half-filled form."""
        self.drafts.keep(kind, loop, Draft(self.initials.now, datetime.now(UTC), texts))

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
            except Refusal as no:
                self.ask(str(no), given)
                return
            self.snapshot = replace(self.snapshot, initials=initials)
            then(initials)

        self.ask("Your initials:", given)

    # papers

    async def action_papers(self) -> None:
        """List the sheets that can be printed."""
        from fertui.tui.chooser import Chooser, Option

        options = [Option(name, about) for name, about in PAPERS.items()]
        await self.open_page(Chooser("Which sheet?", options, lambda name: self.call_next(self.paper, name)))

    async def paper(self, name: str) -> None:
        """Have a sheet made and show it; one with acid only after its cautions and the label."""
        loop, moment = self.snapshot.loop, self.moment
        if name in ("stock", "acid"):
            self.clerk(lambda bench: getattr(bench, name)(loop), partial(self._sheet_made, name), f"the {name} sheet")
        elif name == "report":
            self.clerk(lambda bench: bench.report(loop), lambda answer: self.show_paper(name, answer), "the report")
        else:
            self.clerk(
                lambda bench: getattr(bench, name)(loop, moment), lambda answer: self.show_paper(name, answer), name
            )

    def _sheet_made(self, name: str, answer: Answer) -> None:
        if answer.value is None:
            self.say_at_length(f"No {name} sheet", answer.trouble)
            return
        from fertui.workbench.carrying_out import acids_of

        sheet, loop = answer.value, self.snapshot.loop

        def show(_: float = 0.0) -> None:
            page = f"{name}_page"
            self.clerk(lambda bench: getattr(bench, page)(sheet, loop), lambda page: self.show_paper(name, page), name)

        if acids_of(sheet):
            self.call_next(release, self, sheet, sheet.cautions, show)
        else:
            show()

    def show_paper(self, name: str, answer: Answer, file_name: str = "") -> None:
        """Show a sheet as it will be printed."""
        text = answer if answer.value is None else Answer(answer.value.text.splitlines())
        self.show_text(name.replace("_", " "), text, file_name or f"{name}-{self.moment:%Y-%m-%d}.txt")

    def show_text(self, title: str, answer: Answer, file_name: str = "") -> None:
        """Show lines of text, or the sentence why there are none."""
        lines = answer.value if answer.value is not None else [answer.trouble]
        self.call_next(self.open_page, TextPage(title, lines, file_name))

    def say_at_length(self, title: str, sentence: str) -> None:
        """A sentence that may not fit the bottom line, on a page of its own."""
        self.show_text(title, Answer(trouble=sentence))

    def site_changed(self, site: Site) -> None:
        """The site file is another now."""
        self.snapshot = replace(self.snapshot, site=site)

    # pages and questions above a view

    @property
    def stage_size(self) -> Size:
        """The room there is for a page."""
        return self.query_one(Stage).size

    async def open_page(self, page: View) -> None:
        """Show a form, a list or a text above the view; keys that follow are for it."""
        self._notice = ("", "faint")
        await self.query_one(Stage).push(page)
        self.work_out()

    def close_page(self) -> None:
        """Back to what was open before."""
        self.query_one(Stage).pop()
        if self.page is not None:
            self.page.redraw()
        self.work_out()

    def ask(self, question: str, then: Callable[[str], None], text: str = "") -> None:
        """Ask one question in the bottom line."""
        self.query_one(KeyLine).display = False
        self.query_one(Prompt).ask(question, then, text)

    def end_prompt(self) -> None:
        """Give the bottom line back to the keys and the page its focus."""
        self.query_one(Prompt).display = False
        self.query_one(KeyLine).display = True
        if self.page is not None:
            self.page.focus(scroll_visible=False)

    def roll(self, region: Region, lines: int) -> None:
        """Have the terminal shift the rows of a page that takes the whole width."""
        if isinstance(self._driver, ThinLineDriver):
            self._driver.roll(region.y, region.bottom, lines)

    def forget_screen(self) -> None:
        """Have everything sent again with the next repaint."""
        if isinstance(self._driver, ThinLineDriver):
            self._driver.forget_screen()

    # actions

    async def action_view(self, number: int) -> None:
        """Open a view."""
        self.open_view = number
        self._notice = ("", "faint")
        await self.query_one(Stage).open_view(number, view_numbered(number))
        self.draw_frame()
        if self.page is not None:
            self.page.redraw()
        self.work_out()

    def action_loop(self, step: int) -> None:
        """Show another loop."""
        self.snapshot = self.snapshot.next_loop(step)

    def choose_loop(self, name: str) -> None:
        """Show a loop by name."""
        self.snapshot = replace(self.snapshot, loop=name)

    def action_unit(self) -> None:
        """Show amounts in the next unit."""
        self.snapshot = self.snapshot.next_unit()

    def action_theme(self) -> None:
        """The next look."""
        self.theme = NAMES[(NAMES.index(self.theme) + 1) % len(NAMES)]
        self.keep_settings(replace(self.settings, theme=self.theme))
        self.say(f"colours: {self.theme}")

    def keep_settings(self, settings: Settings) -> None:
        """Remember a choice for the next time."""
        self.settings = settings
        try:
            write_settings(settings)
        except FileTrouble as trouble:
            self.say(str(trouble), "watch")

    async def action_actions(self) -> None:
        """List every action."""
        await self.open_page(action_list(self))

    async def action_help(self) -> None:
        """Help for the page that shows."""
        if self.page is not None and not isinstance(self.page, HelpPage):
            await self.open_page(HelpPage(self.page))

    def action_again(self) -> None:
        """As of now, worked out again, drawn again."""
        self.forget_screen()
        self.changed(self._last_number)
        self.refresh()

    def action_leave(self) -> None:
        """Leave with exit code 0."""
        self.query_one(Stage).keep()
        leaving.leave_soon(0)
        self.exit(0, return_code=0)

    def on_resumed(self, _: Resumed) -> None:
        """Draw everything again."""
        self.forget_screen()
        self.refresh()

    # ends

    def _leave_at_once(self, code: int) -> None:
        for stage in self.query(Stage):
            stage.keep()
        leaving.leave_soon(code)
        self.exit(code, return_code=code)

    def on_line_gone(self, _: LineGone) -> None:
        """The terminal hung up."""
        self._leave_at_once(leaving.exit_code(1))

    def _fatal_error(self) -> None:
        """In place of a traceback over the screen: keep the fault for the entry point, which says one sentence."""
        self.fault = self._exception
        self._close_messages_no_wait()
