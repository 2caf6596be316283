"""An account that cannot reach back as far as asked says so above its table."""

from __future__ import annotations

from datetime import timedelta
from types import SimpleNamespace

from fertui.tui.ink import text_of
from fertui.tui.views.balance import _cut
from tests.paper.hand_made import NOW


def test_the_view_says_why_the_account_begins_later() -> None:
    account = SimpleNamespace(is_cut=True, start=NOW - timedelta(days=3), began="with the analysis of entry 43")
    words = text_of(_cut(account, 90, 200))  # type: ignore[arg-type]
    assert words.strip().startswith("not 90 days: the estimate begins 28 Jun, with the analysis of entry 43")


def test_an_account_of_the_whole_period_says_nothing() -> None:
    assert _cut(SimpleNamespace(is_cut=False), 14, 80) == []  # type: ignore[arg-type]
