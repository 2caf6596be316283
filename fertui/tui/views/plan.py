from fertui.tui.ink import line
from fertui.tui.view import View


class PlanView(View):
    TITLE = "Plan"

    def draw(self, snapshot, width):
        return [line(" to come")]
