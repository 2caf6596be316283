"""How the screen gets its numbers: two desks that work, one snapshot that is replaced when something came."""

from __future__ import annotations

from collections.abc import Callable
from datetime import datetime
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any

from fertui.tui.asking import QUICK, call_for, progress
from fertui.tui.desk import Answer, Call, Came, Desk, Underway
from fertui.tui.faults import fault_sentence
from fertui.tui.settings import Settings
from fertui.tui.shell import Shell
from fertui.tui.snapshot import Ask
from fertui.tui.terminal import Terminal
from fertui.tui.view import View
from fertui.workbench.clock import now

if TYPE_CHECKING:
    from fertui.site.model import Site
    from fertui.workbench import Bench

LOOK_FOR_NEWS_EVERY = 2.0
"""Seconds between looks at the logbook and the site file for what other sessions wrote."""
UNREADABLE = "The program goes on with the site as it was; a repaired file is taken up by itself."


class Working(Shell):
    """The model's desk runs what takes time; the clerk's desk what must not wait for it: logging, last numbers,
    news."""

    def __init__(
        self,
        open_bench: Callable[[], Bench],
        folder: Path,
        at: datetime | None,
        settings: Settings,
        terminal: Terminal,
        operator: str = "",
    ) -> None:
        super().__init__(folder, at, settings, terminal, operator)
        self._model = Desk("model", open_bench, self.post_message)
        self._clerk = Desk("clerk", open_bench, self.post_message)
        self._under_way: dict[Ask, Call] = {}
        self._how_far: Underway | None = None
        self._last_number = -1
        self._site_stamp = 0
        self._last_trouble = ""
        self._untold: tuple[str, str] | None = None

    async def begin(self) -> None:
        """Open the site; the frame is on the screen already."""
        await super().begin()
        self.set_interval(LOOK_FOR_NEWS_EVERY, self._look_for_news)
        self.quietly(
            lambda bench: (bench.site, bench.loops, bench.last_number(), bench.site_stamp()),
            self._opened,
            "opening the site",
        )

    def _opened(self, answer: Answer) -> None:
        self.ready = True
        if answer.value is None:
            self.say_at_length("The site cannot be opened", answer.trouble)
            return
        site, loops, self._last_number, self._site_stamp = answer.value
        unit = self.settings.unit or site.units
        looked = 0 if self.initials.now else self._last_number  # who is not known has seen nothing and missed nothing
        self.snapshot = self.snapshot._replace(
            site=site, loops=loops, loop=loops[0], unit=unit, looked=looked, initials=self.initials.now
        )

    def say_at_length(self, title: str, sentence: str) -> None:
        """A sentence that may not fit the bottom line, on a page of its own."""
        from fertui.tui.text_page import TextPage

        self.call_next(self.open_page, TextPage(title, [sentence]))

    def _tell_once_free(self, title: str, sentence: str) -> None:
        """The same about what nobody here did: in the bottom line at once, the page only once nobody is typing."""
        self.say(title, "act")
        self._untold = (title, sentence)
        self._tell_if_free()

    def _tell_if_free(self) -> None:
        if self._untold is not None and not self.typing:
            self.say_at_length(*self._untold)
            self._untold = None

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
        self._take_back([call for ask, call in self._under_way.items() if ask not in missing])
        for ask in missing:
            if ask not in self._under_way:
                call = call_for(ask, self.moment, partial(self._answered, self._last_number))
                self._under_way[ask] = call
                (self._clerk if ask.use_case in QUICK else self._model).put(call)
        self.update_keys()

    def _take_back(self, unwanted: list[Call]) -> None:
        taken = self._model.take_back(unwanted) if unwanted else []
        self._under_way = {ask: call for ask, call in self._under_way.items() if call not in taken}

    def _answered(self, known: int, ask: Ask, answer: Answer) -> None:
        self._under_way.pop(ask, None)
        fresh = self.snapshot.with_answer(ask, answer)
        self.snapshot = fresh if known == self._last_number else fresh._replace(stale=fresh.stale | {ask})

    def what_is_going_on(self) -> str:
        """What the desks are at."""
        if not self._under_way:
            return ""
        told = self._how_far
        far = (told.doing, told.part) if told is not None and told.call in self._under_way.values() else None
        return progress([ask.use_case for ask in self._under_way], far)

    def on_underway(self, message: Underway) -> None:
        """A desk tells how far it is."""
        self._how_far = message
        self.update_keys()

    async def open_page(self, page: View) -> None:
        """Show a page above the view and have worked out what it needs."""
        await super().open_page(page)
        self.work_out()

    def close_page(self) -> None:
        """Back to what was open before."""
        super().close_page()
        self.work_out()

    # the clerk

    def clerk(self, work: Callable[[Bench], Any], then: Callable[[Answer], None], name: str = "") -> None:
        """Have something quick done on the site; keys wait until its answer was dealt with."""
        self.hold_keys()
        self._clerk.put(Call(work, then, name, holds=True))

    def quietly(self, work: Callable[[Bench], Any], then: Callable[[Answer], None], name: str = "") -> None:
        """The same for what nobody waits for."""
        self._clerk.put(Call(work, then, name))

    async def on_came(self, message: Came) -> None:
        """An answer of a desk: hand it to whoever asked."""
        call, answer = message.call, message.answer
        if answer.fault is not None:
            answer = Answer(trouble=fault_sentence(call.name or "the logbook", answer.fault))
        call.then(answer)
        await self.release_keys(1 if call.holds else 0)

    # what others write

    def _look_for_news(self) -> None:
        self._tell_if_free()
        if self.initials.now != self.snapshot.initials:
            self.snapshot = self.snapshot._replace(initials=self.initials.now)
        if self.snapshot.loop:
            self.quietly(lambda bench: (bench.last_number(), bench.site_stamp()), self._news)

    def _news(self, answer: Answer) -> None:
        if answer.trouble != self._last_trouble:
            self._last_trouble = answer.trouble
            self.say(answer.trouble or "The logbook can be read again.", "act" if answer.trouble else "good")
        if answer.value is None:
            return
        number, stamp = answer.value
        if stamp != self._site_stamp:
            self._site_stamp = stamp
            self.quietly(lambda bench: bench.read_site_again(), self._site_read, "reading the site file")
        elif number != self._last_number:
            self.changed(number)

    def _site_read(self, answer: Answer) -> None:
        """The site file was written by someone: take it up, or say what is wrong with it and go on without."""
        if answer.value is None:
            self._tell_once_free("site.toml cannot be read now", f"{answer.trouble} {UNREADABLE}")
            return
        self._model.put(Call(lambda bench: bench.read_site_again(), lambda _: self.changed(self._last_number)))
        self.site_changed(answer.value)

    def site_changed(self, site: Site) -> None:
        """The site is another now: loops may have come or gone."""
        loops = tuple(loop.name for loop in site.loops)
        loop = self.snapshot.loop if self.snapshot.loop in loops else loops[0]
        self.snapshot = self.snapshot._replace(site=site, loops=loops, loop=loop)

    def changed(self, last_number: int) -> None:
        """The logbook has new entries: what is shown stays until better answers come."""
        self._last_number = last_number
        self.moment = self.fixed_at or now()
        self._take_back(list(self._under_way.values()))
        self._under_way.clear()
        self.snapshot = self.snapshot.outdated()


def _all_at_first(bench: Bench) -> tuple[Site, tuple[str, ...], int, int]:
    return bench.site, bench.loops, bench.last_number(), bench.site_stamp()
