"""How each question of a view is put to the workbench. The work runs on a desk, never in the app's own thread."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from datetime import datetime, timedelta
from typing import TYPE_CHECKING, Any

from fertui.tui.desk import Answer, Call
from fertui.tui.snapshot import Ask

if TYPE_CHECKING:
    from fertui.workbench import Bench

UseCase = Callable[["Bench", Ask, datetime], Any]


def _plainly(bench: Bench, ask: Ask, moment: datetime) -> Any:
    return getattr(bench, ask.use_case)(ask.loop, at=moment, **dict(ask.options))


def _overview(bench: Bench, ask: Ask, moment: datetime) -> Any:
    return bench.overview(at=moment)


def _balance(bench: Bench, ask: Ask, moment: datetime) -> Any:
    return bench.balance(ask.loop, moment - timedelta(days=dict(ask.options)["days"]), moment)


def _forecast(bench: Bench, ask: Ask, moment: datetime) -> Any:
    from fertui.tui.supposing import scenario_of

    options = dict(ask.options)
    supposed = dict(options.get("scenario", ()))
    scenario = scenario_of(supposed) if supposed else None
    return bench.forecast(ask.loop, options["days"], at=moment, scenario=scenario)


def _next_sample(bench: Bench, ask: Ask, moment: datetime) -> Any:
    return bench.next_sample(bench.forecast(ask.loop, dict(ask.options)["days"], at=moment), ask.loop)


def _untimed(bench: Bench, ask: Ask, moment: datetime) -> Any:
    return getattr(bench, ask.use_case)(ask.loop, **dict(ask.options))


def _whole(bench: Bench, ask: Ask, moment: datetime) -> Any:
    return getattr(bench, ask.use_case)(**dict(ask.options))


def _history(bench: Bench, ask: Ask, moment: datetime) -> Any:
    return bench.history(at=moment)


USE_CASES: dict[str, UseCase] = {
    "overview": _overview, "balance": _balance, "forecast": _forecast, "next_sample": _next_sample,
    "stock": _untimed, "acid": _untimed, "aims": _untimed,
    "check": _whole, "history": _history, "open_plans": _untimed, "site_rows": _whole, "supplies_rows": _whole,
    "news": _whole,
}  # fmt: skip
"""Use cases that take other arguments than loop and time."""

QUICK = frozenset(
    {
        "glance",
        "news",
        "previous",
        "history",
        "aims",
        "stock",
        "acid",
        "analysis",
        "site_rows",
        "supplies_rows",
        "stock_rows",
        "open_plans",
    }
)
"""Use cases that run no model: they go to the desk that must not wait."""


def call_for(ask: Ask, moment: datetime, then: Callable[[Ask, Answer], None]) -> Call:
    """The call that works out one question as of ``moment``."""
    use_case = USE_CASES.get(ask.use_case, _plainly)
    return Call(lambda bench: use_case(bench, ask, moment), lambda answer: then(ask, answer), ask.use_case)


WORDS = {
    "overview": "all loops", "today": "where the ions are", "drift": "the days past", "balance": "the account",
    "forecast": "the days ahead", "hindcast": "the record", "plan": "the plan", "glance": "last numbers",
    "history": "the logbook",
}  # fmt: skip


BAR = 8
"""Columns of the bar of progress."""


def progress(use_cases: Sequence[str], far: tuple[str, float] | None = None) -> str:
    """What is being worked out, how far that is where it is told, and how much waits behind it.

    >>> progress(["today", "plan"])
    'working out where the ions are, then 1 more'
    >>> progress(["plan"], ("trying plans", 0.5))
    'trying plans ████░░░░ 50 %'
    """
    behind = f", then {len(use_cases) - 1} more" if len(use_cases) > 1 else ""
    if far is None:
        return f"working out {WORDS.get(use_cases[0], use_cases[0].replace('_', ' '))}{behind}"
    doing, part = far
    done = round(part * BAR)
    return f"{doing} {'█' * done}{'░' * (BAR - done)} {100 * part:.0f} %{behind}"
