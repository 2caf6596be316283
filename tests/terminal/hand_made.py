"""A workbench with results made by hand, so that screens can be tested without the model. All numbers are invented."""

from __future__ import annotations

import sys
from datetime import UTC, datetime, timedelta
from pathlib import Path
from types import SimpleNamespace

from fertui.estimate.points import Estimated, IonState, PointState
from fertui.workbench import Bench

AT = datetime(2026, 12, 1, 7, 42, tzinfo=UTC)


def est(value, spread, band=None):
    return Estimated(value, value - spread, value + spread, band)


def point(k=4.6, ca=11.2, mg=5.0, na=6.2):
    total = k + 2 * ca + 2 * mg
    def share(amount, charge, band):
        return est(100 * amount * charge / total, 2.0, band)
    return PointState(
        est(3.6, 0.2), None,
        {
            "K": IonState(est(k, 0.6), share(k, 1, (18.0, 28.0))),
            "Ca": IonState(est(ca, 0.7), share(ca, 2, (45.0, 62.0))),
            "Mg": IonState(est(mg, 0.4), share(mg, 2, (18.0, 30.0))),
            "Na": IonState(est(na, 0.4, (None, 8.0))),
            "NH4": IonState(est(0.2, 0.1, (None, 0.5))),
        },
    )  # fmt: skip


class HandMade(Bench):
    """The demo's real logbook under results made by hand."""

    def today(self, loop=None, at=None, known=None):
        from fertui.workbench.today import Gauge, Today

        slabs = loop != "lettuce"
        where = "root_zone" if slabs else "tank"
        state = point() if slabs else point(6.0, 4.0, 1.6, 3.0)
        def gauge(what, now, unit, course, leaves):
            return Gauge(what, unit, now, tuple(course), 14, leaves)
        ions = state.ions
        g = (
            gauge("K share", ions["K"].share_pct, "%", [25 - i * 0.9 for i in range(29)], "out since Fri 27 Nov"),
            gauge("Ca share", ions["Ca"].share_pct, "%", [55 + i * 0.4 for i in range(29)], "in 4 (2-9) days"),
            gauge("Mg share", ions["Mg"].share_pct, "%", [26 + i * 0.1 for i in range(29)], "not in 14 days"),
            gauge("Na", ions["Na"].mmol_l, "mmol/L", [4 + i * 0.15 for i in range(29)], "8 to over 14 days"),
            gauge("NH4", ions["NH4"].mmol_l, "mmol/L", [0.2] * 29, "not in 14 days"),
            gauge("EC", state.ec, "mS/cm", [3.2] * 29, ""),
        )
        N = lambda *a: SimpleNamespace(**dict(zip(("code", "severity", "text", "key"), a)))
        watch = (
            N("share_out", "act", "K share in the root zone is 12 %, band 18-28 %. EC is on set point, so EC did not show it.", "p"),
            N("analysis_old", "watch", "Analysis is 9 days old; a sample today would halve the range.", "e"),
            N("log_missing", "note", "Drain of yesterday is not logged.", "w"),
        ) if slabs else (N("x", "note", "No reading since yesterday 11:42.", "r"),)
        glance = self.glance(loop, at)
        return Today(loop, glance.layout, glance.crop, glance.stage, glance.medium, at, where, {where: state}, glance.last_analysis, None,
                     glance.readings, 2.6, 5.6, 31.0, 640.0, {"calcium": 4.1, "sulfate": 2.9}, g, watch, 5, ("sample of the drain sent Mon 30 Nov",), ())

    def record_all(self, entries, loop):
        return tuple(self.record(kind, texts, loop) for kind, texts in entries)

    def overview(self, at=None, known=None):
        return tuple(self.today(name, at) for name in self.loops)


if __name__ == "__main__":
    from fertui.tui.app import run_on

    here = Path(sys.argv[1])
    sys.exit(run_on(lambda: HandMade(here), here))
