"""The middle of the screen: the open view and, above it, the form, list or help that was opened from it."""

from __future__ import annotations

from typing import TYPE_CHECKING, cast

from textual.widget import Widget

from fertui.tui.view import View

if TYPE_CHECKING:
    from fertui.tui.frame import FertuiApp


class Stage(Widget):
    """Keeps every view once opened, so that it stays as it was left, and a pile of pages above the open one."""

    def __init__(self) -> None:
        super().__init__()
        self._views: dict[int, View] = {}
        self._open = 0
        self._pile: list[View] = []

    @property
    def top(self) -> View | None:
        """The page that shows."""
        return self._pile[-1] if self._pile else self._views.get(self._open)

    @property
    def piled(self) -> int:
        """Pages above the view."""
        return len(self._pile)

    def keep(self) -> None:
        """Have every page keep what must not be lost."""
        for page in (*self._views.values(), *self._pile):
            page.keep()

    async def open_view(self, number: int, make: type[View]) -> None:
        """Show a view and drop what was piled above the one before."""
        hidden = self.top
        for page in self._pile:
            page.remove()
        self._pile = []
        if hidden is not None:
            hidden.display = False
        self._open = number
        if number in self._views:
            self._views[number].display = True
        else:
            self._views[number] = make()
            await self._mount(self._views[number])
        self.screen.set_focus(self._views[number], scroll_visible=False)

    async def _mount(self, page: View) -> None:
        """Add a page with its lines ready, so that its first paint is not a blank one."""
        page.prepare(cast("FertuiApp", self.app).snapshot, self.size)
        await self.mount(page)

    async def push(self, page: View) -> None:
        """Show a page above the others."""
        if self.top is not None:
            self.top.display = False
        self._pile.append(page)
        await self._mount(page)
        self.screen.set_focus(page, scroll_visible=False)

    def pop(self) -> None:
        """Take the top page away."""
        if self._pile:
            self._pile.pop().remove()
            if self.top is not None:
                self.top.display = True
                self.screen.set_focus(self.top, scroll_visible=False)
