"""What a form is told of a value before anything is written."""

from __future__ import annotations

from pathlib import Path

import pytest

from fertui.refusals import Refusal
from fertui.workbench import open_site


@pytest.mark.parametrize(
    ("name", "text", "says"),
    [
        ("at", "28.11.2025 7:30", "Fri 28 Nov 2025 07:30"),
        ("at", "2025-11-28", "Fri 28 Nov 2025"),
        ("at", "2025-11-28T07:30+00:00", "Fri 28 Nov 2025 08:30"),
        ("NO3-N", "168 mg/L", "11.99 mmol/L NO3"),
    ],
)
def test_what_was_understood_of_a_value_or_time(demo_once: Path, name: str, text: str, says: str) -> None:
    # Calendar and time zone of Rome, where the demo stands: UTC + 1 in winter (IANA); N 14.007 (CIAAW 2021)
    assert open_site(demo_once).echo("analysis", name, text, "north bay") == says


def test_a_time_that_is_none_is_refused(demo_once: Path) -> None:
    with pytest.raises(Refusal, match="is not a time"):
        open_site(demo_once).echo("reading", "at", "half past", "north bay")


def test_a_salt_of_a_batch_is_understood_as_the_logbook_takes_it(demo_once: Path) -> None:
    bench = open_site(demo_once)
    salt = next(supply.name for supply in bench.site.supplies if supply.strength_pct is None)
    assert bench.echo("batch", salt, "88", "north bay") == "88 kg"
    with pytest.raises(Refusal, match="unobtainium"):
        bench.echo("batch", "unobtainium", "88", "north bay")
