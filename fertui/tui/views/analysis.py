from fertui.tui.ink import line
from fertui.tui.view import View


class AnalysisView(View):
    TITLE = "Analysis"

    def draw(self, snapshot, width):
        return [line(" to come")]
