from fertui.tui.ink import line
from fertui.tui.view import View


class SiteView(View):
    TITLE = "Site"

    def draw(self, snapshot, width):
        return [line(" to come")]
