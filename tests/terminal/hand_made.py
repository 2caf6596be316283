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

        def noticed(*a):
            return SimpleNamespace(**dict(zip(("code", "severity", "text", "key"), a, strict=False)))

        watch = (
            (
                noticed(
                    "share_out",
                    "act",
                    "K share in the root zone is 12 %, band 18-28 %. EC is on set point, so EC did not show it.",
                    "p",
                ),
                noticed("analysis_old", "watch", "Analysis is 9 days old; a sample today would halve the range.", "e"),
                noticed("log_missing", "note", "Drain of yesterday is not logged.", "w"),
            )
            if slabs
            else (noticed("x", "note", "No reading since yesterday 11:42.", "r"),)
        )
        glance = self.glance(loop, at)
        return Today(
            loop,
            glance.layout,
            glance.crop,
            glance.stage,
            glance.medium,
            at,
            where,
            {where: state},
            glance.last_analysis,
            None,
            glance.readings,
            2.6,
            5.6,
            31.0,
            640.0,
            {"calcium": 4.1, "sulfate": 2.9},
            g,
            watch,
            5,
            awaited=("sample of the drain sent Mon 30 Nov",),
        )

    def overview(self, at=None, known=None):
        return tuple(self.today(name, at) for name in self.loops)

    def drift(self, loop=None, days=28, at=None, known=None):
        from fertui.workbench.drift import Drift, Mark, Series

        times = tuple(at - timedelta(days=days - d) for d in range(days + 1))

        def series(what, unit, start, slope, spread, band, every=9):
            values = tuple(est(start + slope * d, spread * (0.3 + (d % every) / every), band) for d in range(days + 1))
            measured = tuple((times[d], start + slope * d + 0.3 * spread) for d in range(0, days, every))
            return Series(what, unit, band, times, values, measured)

        return Drift(
            loop, "root_zone",
            (series("K share", "%", 25, -0.45, 2.5, (18.0, 28.0)), series("Ca share", "%", 50, 0.35, 2.5, (45.0, 62.0)),
             series("Na", "mmol/L", 4, 0.08, 0.5, (None, 8.0)), series("EC", "mS/cm", 3.4, 0.005, 0.2, None)),
            (Mark(times[9], "analysis", "K 7.1 Ca 9.0 Mg 4.1", 12), Mark(times[12], "batch", "tank calcium", 15),
            Mark(times[20], "bleed", "litres 3000", 21)),
        )  # fmt: skip

    def balance(self, loop=None, start=None, end=None, known=None):
        from fertui.estimate.balance import BalanceRow

        def row(**v):
            return BalanceRow(**{**dict.fromkeys(BalanceRow._fields, 0.0), **v})

        ions = {
            "K": row(start_mmol=61000.0, make_up=5000.0, stock=348000.0, uptake=-377000.0, exchange=4200.0,
            bleed=-1200.0, unexplained=-300.0, end_mmol=39700.0),
            "Ca": row(start_mmol=81000.0, make_up=66000.0, stock=190000.0, uptake=-240000.0, exchange=-2100.0,
            bleed=-2300.0, unexplained=900.0, end_mmol=93500.0),
            "Na": row(start_mmol=31000.0, make_up=41000.0, uptake=-22000.0, bleed=-800.0, end_mmol=49200.0),
        }  # fmt: skip
        columns = BalanceRow._fields
        begun = {"asked": start, "is_cut": False, "began": ""}
        return SimpleNamespace(start=start, end=end, ions=ions, columns=columns, entries={}, **begun)

    def next_sample(self, ahead, loop=None, known=None):
        taken, why = ahead.at + timedelta(days=3), "the medium exchanges: every week"
        narrows = {("root_zone", "K share"): 38.0}
        return SimpleNamespace(take_at=taken, result_at=taken + timedelta(days=2), why=why, narrows_pct=narrows)

    def forecast(self, loop=None, days=14, at=None, known=None, scenario=None):
        where = "root_zone" if loop != "lettuce" else "tank"
        lift = 0.0 if scenario is None else 0.08

        def day(d):
            return SimpleNamespace(
                at=at + timedelta(days=d),
                points={where: point(4.6 - (0.12 - lift) * d, 11.2 + 0.05 * d, 5.0, 6.2 + 0.1 * d)},
            )

        def days_left(v, lo, hi):
            return SimpleNamespace(value=v, low=lo, high=hi)

        def leaving(what, days, p, since=None):
            return SimpleNamespace(point=where, what=what, at=None, days=days, since=since, probability=p)

        leaves = (
            leaving("K share", days_left(0.0, 0.0, 0.0), 1.0, at - timedelta(days=4)), leaving("Ca share",
            days_left(4.0, 2.0, 9.0), 0.84),
            leaving("Mg share", days_left(None, None, None), 0.03), leaving("Na", days_left(None, 8.0, None), 0.22),
            leaving("EC", days_left(None, None, None),
            0.0),
        )  # fmt: skip
        return SimpleNamespace(at=at, days=tuple(day(d) for d in range(days + 1)), leaves_band=leaves, inputs="routine",
                               assumed=("light as in the last 7 days, 1413 J/cm2 a day",
                               "crop water 3.1 (2.8-3.4) L/m2 a day"))  # fmt: skip

    def hindcast(self, loop=None, at=None, known=None, inputs="logged"):
        def row(d, ion, found, said, low, high, none):
            return SimpleNamespace(
                    at=at - timedelta(days=d), point="root_zone", ion=ion, measured_share_pct=found,
                    predicted_share_pct=said, low_share_pct=low,
                    high_share_pct=high, no_change_share_pct=none, cold_start=d > 40, doubtful=False,
                )  # fmt: skip

        rows = tuple(
            row(d, ion, f, f + 0.8, f - 1.5, f + 2.2, f + 3)
            for d in (44, 30, 16)
            for ion, f in (("K", 22.0), ("Ca", 53.0), ("Mg", 25.0))
        )
        return SimpleNamespace(
            inputs=inputs,
            rows=rows,
            summary=SimpleNamespace(
                words="3 forecasts judged: error of shares 0.8 points, 'no change' 3.0; "
                "80 % of what was found lay in the 80 % range."
            ),
        )

    def plan(self, loop=None, days=14, at=None, known=None, **wishes):
        from fertui.planning import values as v

        slabs = loop != "lettuce"
        where = "root_zone" if slabs else "tank"

        def outlook(k, ca):
            return v.Outlook({where: point(k, ca)})

        def caution(s, t):
            return SimpleNamespace(code="c", severity=s, text=t, source="invented")

        recipe = v.RecipeChange(
            {"K": 9.4, "Ca": 5.1, "Mg": 2.2, "NH4": 0.6, "NO3": 15.9, "SO4": 3.4, "H2PO4": 1.2},
            {"K": 18.0, "Ca": -9.0, "Mg": -8.0},
            2.6,
            (),
            None,
        )
        steps = (
            v.Step(at + timedelta(days=1), "potassium nitrate", "KNO3", 0.65, "tank:tank", {"K": 6400.0}),
            v.Step(at + timedelta(days=3), "potassium nitrate", "KNO3", 0.6, "tank:tank", {"K": 5900.0}),
        )
        acid = (v.AcidStep(at, "nitric acid 38", 38.0, 1.23, 0.42, "tank:tank", 30.0, 6.2, 5.5),)
        return v.Plan(
            True, None, loop, "drain-blend" if slabs else "shared-tank", at, days, where, recipe if slabs else None,
            () if slabs else steps,
            () if slabs else acid, None, None, outlook(4.6, 11.2), outlook(8.0, 10.0), outlook(3.9, 11.9),
            (v.Binding("EC", 2.6, "mS/cm", 2.6, "own setting"),),
            ("K 12 % below 18 %: one step of +25 % K, then look again.",),
            (caution("note", "The safety data sheet, site procedure, local code and licensed practice come first."),
             caution("warning", "Potassium nitrate is an oxidiser: keep it from combustibles.")),
            ("KNO3 and not K2SO4: SO4 is above its target already.",), ("0.65 kg KNO3 / 0.1011 kg/mol = 6.43 mol K",
            "6.43 mol / 2000 L = 3.2 mmol/L"),
        )  # fmt: skip


def open_hand_made(site: Path, at: str = "") -> int:
    """Show a site with these results until the operator leaves; returns the exit code."""
    from fertui.refusals import Refusal
    from fertui.tui import working
    from fertui.tui.app import run_on

    working.LOOK_FOR_NEWS_EVERY = 0.25  # seconds; tests wait for what others write
    try:
        return run_on(lambda: HandMade(site), site, datetime.fromisoformat(at) if at else None)
    except Refusal as no:
        print(no)
        return 2


if __name__ == "__main__":
    sys.exit(open_hand_made(Path(sys.argv[1]), *sys.argv[2:3]))
