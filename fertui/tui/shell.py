"""The screen and the keyboard: frame, pages, the question in the bottom line, one key after the other, the ends."""

from __future__ import annotations

from collections import deque
from collections.abc import Callable
from datetime import datetime
from pathlib import Path
from typing import Any, cast

from textual import events
from textual.app import App, ComposeResult
from textual.binding import Binding
from textual.geometry import Region, Size
from textual.reactive import var
from textual.screen import Screen

from fertui.tui import leaving
from fertui.tui.driver import LineGone, Resumed, ThinLineDriver
from fertui.tui.header_line import HeaderLine
from fertui.tui.initials import Initials
from fertui.tui.key_line import KeyLine, key_name
from fertui.tui.keys import VIEW_NAMES
from fertui.tui.prompt import Prompt
from fertui.tui.settings import Settings
from fertui.tui.snapshot import Ask, Snapshot
from fertui.tui.stage import Stage
from fertui.tui.terminal import FLOOR, Terminal
from fertui.tui.themes import THEMES, usual_theme
from fertui.tui.view import View
from fertui.tui.view_line import ViewLine
from fertui.workbench.clock import now


class Frame(Screen[None], inherit_bindings=False):
    """The one screen: header, view names, stage, keys."""

    def compose(self) -> ComposeResult:
        """The parts from top to bottom; the prompt takes the place of the keys while it asks."""
        yield HeaderLine()
        yield ViewLine()
        yield Stage()
        yield KeyLine()
        yield Prompt()

    async def on_mount(self) -> None:
        """The parts stand: begin."""
        await cast("Shell", self.app).begin()

    def on_resize(self, event: events.Resize) -> None:
        """A new size: nothing of what the terminal shows is known. The toolkit paints again unless the size went
        there and back so fast that it saw none."""
        cast("Shell", self.app).forget_screen()
        if event.size == self.size:
            self.app.refresh()


class Shell(App[int], inherit_bindings=False):
    """What is on the screen and where a key goes. It knows nothing of sites."""

    CSS_PATH = "app.tcss"
    ENABLE_COMMAND_PALETTE = False

    snapshot: var[Snapshot] = var(Snapshot, init=False)

    def __init__(
        self, folder: Path, at: datetime | None, settings: Settings, terminal: Terminal, operator: str = ""
    ) -> None:
        no_colour = terminal.colours == 0
        super().__init__(driver_class=ThinLineDriver, ansi_color=True if no_colour else None)
        self.folder, self.settings, self.terminal = folder, settings, terminal
        self.fixed_at = at
        self.moment = at or now()
        self.initials = Initials(operator, settings.initials_minutes)
        self.fault: BaseException | None = None
        self.open_view = 1
        self._notice = ("", "faint")
        self.ready = False
        self._holding = 0
        self._held: deque[events.Key | events.Paste] = deque()
        for theme in THEMES:
            self.register_theme(theme)
        self.theme = usual_theme(0) if no_colour else settings.theme or usual_theme(terminal.colours)
        self.animation_level = "none"
        self.set_keymap(dict(settings.keys))

    def get_default_screen(self) -> Screen[None]:
        """The frame."""
        return Frame()

    async def begin(self) -> None:
        """The frame stands."""
        leaving.on_signals(self.leave_at_once)

    # what is shown

    @property
    def page(self) -> View | None:
        """The page that shows."""
        return self.query_one(Stage).top

    @property
    def stage_size(self) -> Size:
        """The room there is for a page."""
        return self.query_one(Stage).size

    @property
    def too_small(self) -> bool:
        """Whether the screen is below the floor for which views are made."""
        return self.size.width < FLOOR[0] or self.size.height < FLOOR[1]

    @property
    def typing(self) -> bool:
        """Whether a question or a page above the view stands, which must not be taken away from whoever answers."""
        return self.query_one(Prompt).display or self.query_one(Stage).piled > 0

    def draw_frame(self) -> None:
        """Header, view names and keys."""
        now = self.snapshot
        moment = f"as of {self.local(self.moment):%a %-d %b %H:%M}"
        self.query_one(HeaderLine).say(self._where(), moment, now.initials)
        loops = f"loop {now.loops.index(now.loop) + 1}/{len(now.loops)}" if len(now.loops) > 1 else ""
        self.query_one(ViewLine).mark(VIEW_NAMES, self.open_view, loops)
        self.update_keys()

    def _where(self) -> str:
        if self.snapshot.site is None:
            return self.folder.name
        site, loop = self.snapshot.site, self.snapshot.site.loop(self.snapshot.loop)
        glance = self.snapshot.get(Ask("glance", loop.name))
        crop, stage = (loop.crop, loop.stage) if glance is None else (glance.crop, glance.stage)
        grown = ", ".join(word for word in (crop, stage, loop.medium) if word and word != "none")
        return f"{site.name}, {loop.name}: {grown}"

    def local(self, moment: datetime) -> datetime:
        """A moment on the clock of the site."""
        if self.snapshot.site is None:
            return moment.astimezone()
        from zoneinfo import ZoneInfo

        return moment.astimezone(ZoneInfo(self.snapshot.site.timezone))

    def say(self, notice: str, ink: str = "faint") -> None:
        """A notice in the bottom line, until the next key."""
        self._notice = (notice, ink)
        self.update_keys()

    def what_is_going_on(self) -> str:
        """Words for the bottom line while there is no notice."""
        return ""

    def update_keys(self) -> None:
        """The bottom line: keys of the page and the frame, and what is going on."""
        page = self.page
        if page is None:
            return
        notice, ink = self._notice
        notice = notice or self.what_is_going_on() or (f"{page.below} more below" if page.below else "")
        self.query_one(KeyLine).say(self._key_words(page), notice, ink)

    def _key_words(self, page: View) -> list[tuple[str, str]]:
        """Keys to show: those of the page first, each action once; above a view the page's own alone."""
        own = {binding.id for bindings in page._bindings.key_to_bindings.values() for binding in bindings}
        shown: dict[str | None, Binding] = {}
        for active in self.screen.active_bindings.values():
            if active.binding.show and (active.node is not page or page.offers(active.binding.action)):
                shown.setdefault(active.binding.id, active.binding)
        ordered = sorted(shown.values(), key=lambda binding: binding.id not in own)
        if self.query_one(Stage).piled:
            ordered = [binding for binding in ordered if binding.id in own]
        return [(key_name(binding.key), binding.description) for binding in ordered]

    # pages and the question in the bottom line

    async def open_page(self, page: View) -> None:
        """Show a form, a list or a text above the view; keys that follow are for it."""
        self._notice = ("", "faint")
        await self.query_one(Stage).push(page)
        self.update_keys()

    def close_page(self) -> None:
        """Back to what was open before."""
        self.query_one(Stage).pop()
        if self.page is not None:
            self.page.redraw()

    def ask(self, question: str, then: Callable[[str], object], text: str = "") -> None:
        """Ask one question in the bottom line."""
        self.query_one(KeyLine).display = False
        self.query_one(Prompt).ask(question, then, text)

    def end_prompt(self) -> None:
        """Give the bottom line back to the keys and the page its focus."""
        self.query_one(Prompt).display = False
        self.query_one(KeyLine).display = True
        if self.page is not None:
            self.screen.set_focus(self.page, scroll_visible=False)

    # keys

    async def on_event(self, event: events.Event) -> None:
        """Keys are taken one after the other, each done with before the next: what is typed ahead lands where it
        is meant."""
        if isinstance(event, events.Key | events.Paste) and not event.is_forwarded:
            if not self.ready and self._leaves(event):
                await self._press(event)
                return
            self._held.append(event)
            await self.release_keys()
        else:
            await super().on_event(event)

    def _leaves(self, event: events.Event) -> bool:
        """Whether it is a key that leaves: one need not wait for what may never open."""
        if not isinstance(event, events.Key) or not self.screen_stack:
            return False
        active = self.screen.active_bindings.get(event.key)
        return active is not None and active.binding.id in ("leave", "leave.at_once")

    def hold_keys(self) -> None:
        """Keep keys back while something is under way that decides what they mean."""
        self._holding += 1

    def drop_held_keys(self) -> int:
        """Leave out keys that were typed before a question showed; returns how many."""
        dropped = len(self._held)
        self._held.clear()
        return dropped

    async def release_keys(self, done: int = 0) -> None:
        """Take the keys that were kept back, unless something else is under way or there is nothing yet to act on."""
        self._holding -= done
        while self._held and self.ready and not self._holding:
            await self._press(self._held.popleft())

    async def _press(self, event: events.Key | events.Paste) -> None:
        """A key: typed into what has the focus, or the action it is bound to."""
        self.initials.touch()
        if self._notice[0]:
            self.say("")
        taker: Any = self.focused
        if isinstance(event, events.Paste):
            if hasattr(taker, "take_paste"):
                taker.take_paste(event.text)
            return
        if taker is not None and taker.take_key(event):
            return
        active = self.screen.active_bindings.get(event.key)
        if active is not None:
            await self.run_action(active.binding.action, active.node)

    # the terminal

    def roll(self, region: Region, lines: int) -> None:
        """Have the terminal shift the rows of a page that takes the whole width."""
        if isinstance(self._driver, ThinLineDriver):
            self._driver.roll(region.y, region.bottom, lines)

    def forget_screen(self) -> None:
        """Have everything sent again with the next repaint."""
        if isinstance(self._driver, ThinLineDriver):
            self._driver.forget_screen()

    def on_resumed(self, _: Resumed) -> None:
        """After a pause: draw everything again."""
        self.forget_screen()
        self.refresh()

    # ends

    def leave_at_once(self, code: int) -> None:
        """Leave with this exit code; what is half typed is kept."""
        for stage in self.query(Stage):
            stage.keep()
        leaving.leave_soon(code)
        self.exit(code, return_code=code)

    def on_line_gone(self, _: LineGone) -> None:
        """The terminal hung up."""
        self.leave_at_once(leaving.HUNG_UP)

    def _fatal_error(self) -> None:
        """In place of a traceback over the screen: keep the fault for the entry point, which says one sentence."""
        self.fault = self._exception
        self._close_messages_no_wait()
