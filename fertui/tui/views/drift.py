from fertui.tui.ink import line
from fertui.tui.view import View


class DriftView(View):
    TITLE = "Drift"

    def draw(self, snapshot, width):
        return [line(" to come")]
