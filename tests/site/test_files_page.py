"""docs/files.md: its example is a site, and no key of site.toml is missing from it."""

from __future__ import annotations

import re
from pathlib import Path

from fertui.site.edit import changed, rows
from fertui.site.files import parse_site
from fertui.site.layout import toml_of
from fertui.site.model import Instrument, Loop, StockTank, Supply
from fertui.site.writing import tables_of

PAGE = (Path(__file__).parents[2] / "docs" / "files.md").read_text(encoding="utf-8")
EXAMPLE = PAGE.partition("```toml\n")[2].partition("```")[0]
SPELLED = {"feed_ec": "feed_EC", "feed_ph": "feed_pH", "premix_ec": "premix_EC"}


def test_the_example_is_a_site() -> None:
    site = parse_site(EXAMPLE.encode())
    assert {loop.layout for loop in site.loops} == {"shared-tank", "drain-blend", "known-feed"}
    assert set(tables_of(site)) >= {"site", "loops", "waters", "supplies", "stock_tanks", "targets", "bands", "limits"}


def test_the_example_is_written_and_edited_without_loss() -> None:
    site = parse_site(EXAMPLE.encode())
    assert parse_site(toml_of(tables_of(site)).encode()) == site
    for row in rows(site):
        assert changed(site, row.key, row.text, source=row.source) == site, row


def test_every_key_is_in_the_example() -> None:
    for model in (Loop, Supply, StockTank, Instrument):
        for name in model._fields:
            key = SPELLED.get(name, name)
            assert re.search(rf"\b{re.escape(key)}\b", EXAMPLE), f"{model.__name__}.{key}"
