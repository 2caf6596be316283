from fertui.tui.ink import line
from fertui.tui.view import View


class BalanceView(View):
    TITLE = "Balance"

    def draw(self, snapshot, width):
        return [line(" to come")]
