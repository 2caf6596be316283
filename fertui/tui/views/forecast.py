from fertui.tui.ink import line
from fertui.tui.view import View


class ForecastView(View):
    TITLE = "Forecast"

    def draw(self, snapshot, width):
        return [line(" to come")]
