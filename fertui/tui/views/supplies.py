from fertui.tui.ink import line
from fertui.tui.view import View


class SuppliesView(View):
    TITLE = "Supplies"

    def draw(self, snapshot, width):
        return [line(" to come")]
