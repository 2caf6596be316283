"""What ``fertui demo --text`` prints: for each loop its state, the days ahead and a plan."""

from __future__ import annotations

from fertui.cli.views import forecast, plan, today
from fertui.workbench import Bench
from fertui.workbench.carrying_out import acids_of

RULE = "-" * 78


def text(bench: Bench) -> str:
    """State, forecast and plan of every loop."""
    timezone, unit = bench.site.timezone, bench.site.units
    parts = []
    for name in bench.loops:
        state = bench.today(name)
        ahead = bench.forecast(name)
        parts += [
            today.text(state, timezone, unit),
            forecast.text(ahead, bench.next_sample(ahead, name), name, state.managed_point, timezone, unit),
            plan.text(planned := bench.plan(name), timezone, unit, acids_of(planned)),
        ]
    return f"\n{RULE}\n".join(parts)
