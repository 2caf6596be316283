"""Options as the command line carries them, read: which site, loop and time, numbers, names, values."""

from __future__ import annotations

import argparse
from datetime import datetime
from typing import Any

from fertui.refusals import Refusal
from fertui.workbench import Bench, open_site

Options = argparse.Namespace


def read_view(options: Options) -> tuple[Bench, dict[str, Any]]:
    """The bench, and which loop as of when."""
    from fertui.workbench.clock import now

    bench = open_site(options.site)
    view = {"loop": options.loop, "at": read_time(bench, options.at) or now(), "known": read_time(bench, options.known)}
    return bench, view


def read_time(bench: Bench, written: str | None) -> datetime | None:
    """A time as people write it, on the clock of the site; None where none was given."""
    return None if written is None else bench.time(written)


def read_unit(bench: Bench, options: Options) -> str:
    """The unit shown: the one asked for, else the site's."""
    return str(options.unit or bench.site.units)


def read_fields(words: list[str]) -> dict[str, str]:
    """``name=value`` words as a mapping; refuses a word without '=' and a name given twice."""
    fields: dict[str, str] = {}
    for word in words:
        name, sign, value = word.partition("=")
        if not sign or not name:
            raise Refusal(f"{word!r} is not name=value, such as EC=2.6 or note='filter cleaned'.")
        if name in fields:
            raise Refusal(f"{name!r} is given twice; give it once.")
        fields[name] = value
    return fields


def read_names(written: str) -> tuple[str, ...]:
    """Names separated by commas."""
    return tuple(name.strip() for name in written.split(",") if name.strip())


def read_whole(written: str, what: str, lowest: int = 0, highest: int = 2**31) -> int:
    """A whole number of an option; refuses one out of range."""
    try:
        number = int(written)
    except ValueError:
        number = lowest - 1
    if not lowest <= number <= highest:
        raise Refusal(f"{what} {written!r} is not a whole number from {lowest} to {highest}.")
    return number


def read_number(written: str, what: str) -> float:
    """A number of an option as people write it."""

    from fertui.quantities import QuantityError, parse_number

    try:
        return parse_number(written).value
    except QuantityError as no:
        raise Refusal(f"{what}: {no}") from None
