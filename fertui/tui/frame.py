"""The app: nine views over one snapshot, and the keys that work from all of them."""

from __future__ import annotations

from typing import Any, ClassVar

from fertui.refusals import FileTrouble
from fertui.tui.keys import GLOBAL_KEYS
from fertui.tui.papers import Papers
from fertui.tui.settings import Settings, write_settings
from fertui.tui.stage import Stage
from fertui.tui.themes import NAMES
from fertui.tui.views import view_numbered


class FertuiApp(Papers):
    """The terminal interface of one site."""

    BINDINGS: ClassVar[list[Any]] = GLOBAL_KEYS

    async def begin(self) -> None:
        """Open Today, then the site."""
        await self.action_view(1)
        await super().begin()

    async def action_view(self, number: int) -> None:
        """Open a view."""
        self.open_view = number
        self._notice = ("", "faint")
        await self.query_one(Stage).open_view(number, view_numbered(number))
        self.draw_frame()
        if self.page is not None:
            self.page.redraw()
        self.work_out()

    async def action_news(self) -> None:
        """Open the logbook at what others wrote since the person at the keyboard last looked."""
        from fertui.tui.views.logbook import LogbookView

        entries = self.snapshot.get(self.snapshot.news) or ()
        if not entries:
            self.say("Nobody else has written since you looked.")
            return
        await self.action_view(7)
        if isinstance(self.page, LogbookView):
            self.page.show_news(tuple(entry.number or 0 for entry in entries))
        self.snapshot = self.snapshot._replace(looked=self._last_number)

    def action_loop(self, step: int) -> None:
        """Show another loop."""
        if len(self.snapshot.loops) < 2:
            self.say("This site has one loop.")
        self.snapshot = self.snapshot.next_loop(step)

    def choose_loop(self, name: str) -> None:
        """Show a loop by name."""
        self.snapshot = self.snapshot._replace(loop=name)

    def go_on_round(self, saved: str) -> None:
        """A round was walked through and saved: open that of the next loop, after the last loop Today."""
        self.hold_keys()  # what is typed ahead is for the next round, not for the view under it
        self.call_next(self._next_round, saved)

    async def _next_round(self, saved: str) -> None:
        loops, loop = self.snapshot.loops, self.snapshot.loop
        later = loops[loops.index(loop) + 1 :]
        if later:
            self.choose_loop(later[0])
            await self.action_enter("reading")
        else:
            await self.action_view(1)
        self.say(saved, "good")
        await self.release_keys(1)

    def choose_unit(self, unit: str) -> None:
        """Show amounts in a unit, and take bare numbers in it."""
        self.snapshot = self.snapshot._replace(unit=unit)

    def action_unit(self) -> None:
        """Show amounts in the next unit."""
        self.snapshot = self.snapshot.next_unit()
        self.say(f"amounts in {self.snapshot.unit}")

    def action_theme(self) -> None:
        """The next look."""
        self.theme = NAMES[(NAMES.index(self.theme) + 1) % len(NAMES)]
        self.keep_settings(self.settings._replace(theme=self.theme))
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
        from fertui.tui.actions import action_list

        await self.open_page(action_list(self))

    async def action_help(self) -> None:
        """Help for the page that shows."""
        from fertui.tui.help import HelpPage

        if self.page is not None and not isinstance(self.page, HelpPage):
            await self.open_page(HelpPage(self.page))

    def action_again(self) -> None:
        """As of now, worked out again, drawn again."""
        self.forget_screen()
        self.changed(self._last_number)
        self.refresh()

    def action_leave(self) -> None:
        """Leave with exit code 0."""
        self.leave_at_once(0)
