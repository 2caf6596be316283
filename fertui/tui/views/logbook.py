from fertui.tui.ink import line
from fertui.tui.view import View


class LogbookView(View):
    TITLE = "Logbook"

    def draw(self, snapshot, width):
        return [line(" to come")]
