"""Every caution, hazard band and pair of the catalogue as tables, for docs/safety.md."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from fertui.catalogue.acids import acids
from fertui.catalogue.figures import Provenance, table
from fertui.catalogue.salts import salts


def safety_tables() -> str:
    """Markdown of all cautions, by substance, strength, pair and for the loop."""
    data = table("cautions")
    bearers = _bearers()
    return "\n\n".join(
        [
            f"**First of all:** {data['first']['text']}",
            "## By substance",
            _table(("for", "severity", "caution", "source"), (_card(each, bearers, data) for each in data["cautions"])),
            "## Hazard statements by strength",
            _table(("substance", "mass %", "signal", "statements", "source"), _bands(bearers, data)),
            "\n".join(f"- {code}: {said}" for code, said in data["statements"].items()),
            "## What must not meet",
            _table(("what", "where", "severity", "why", "source"), (_pair(each, data) for each in data["pairs"])),
            "## Regulated precursors",
            _table(
                ("substance", "above mass %", "notice"),
                ((bearers[each["of"]], f"{each['above_pct']:g}", each["text"]) for each in data["precursors"]),
            ),
            "Source: " + _source("precursor", data) + ".",
            "## For every loop that is dosed",
            _table(
                ("severity", "caution", "source"),
                ((each["severity"], each["text"], _source(each["source"], data)) for each in data["loop"]),
            ),
        ]
    )


def _bearers() -> dict[str, str]:
    """Caution code -> the substances that carry it."""
    pairs = [
        *((code, each.name) for each in salts() for code in each.cautions),
        *((code, each.name) for each in acids() for code in each.cautions),
    ]
    names: dict[str, dict[str, None]] = {}
    for code, name in pairs:
        names.setdefault(code, {})[name] = None
    return {code: ", ".join(found) for code, found in names.items()}


def _card(card: Mapping[str, Any], bearers: Mapping[str, str], data: Mapping[str, Any]) -> tuple[str, ...]:
    whom = ", ".join(bearers[of] for of in card["of"])
    strength = f", from {card['from_pct']:g} %" if "from_pct" in card else ""
    return f"{whom}{strength}", card["severity"], card["text"], _source(card["source"], data)


def _bands(bearers: Mapping[str, str], data: Mapping[str, Any]) -> Iterable[tuple[str, ...]]:
    for entry in data["hazards"]:
        for band in entry["bands"]:
            top = f" to below {band['below_pct']:g}" if band["below_pct"] <= 100 else " and more"
            strength = f"{band['from_pct']:g}{top}"
            said = ", ".join(band["statements"])
            yield bearers[entry["of"]], strength, band["signal"], said, _source(entry["source"], data)


def _pair(pair: Mapping[str, Any], data: Mapping[str, Any]) -> tuple[str, ...]:
    where = {"shelf": "as sold", "stock": "one stock tank"}.get(pair["where"], "anywhere")
    return " + ".join(pair["families"]), where, pair["severity"], pair["text"], _source(pair["source"], data)


def _source(key: str, data: Mapping[str, Any]) -> str:
    return Provenance(**data["sources"][key]).shown


def _table(head: tuple[str, ...], rows: Iterable[tuple[str, ...]]) -> str:
    lines = [head, ("---",) * len(head), *rows]
    return "\n".join(f"| {' | '.join(line)} |" for line in lines)
