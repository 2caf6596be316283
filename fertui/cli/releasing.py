"""Acid and lye on the command line: held back until the cautions were read and the label matches."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from fertui.cli.options import Options, read_number
from fertui.refusals import Refusal

if TYPE_CHECKING:
    from fertui.paper import Page
    from fertui.workbench import Bench


def held_back(bench: Bench, made: Any, options: Options) -> tuple[tuple[str, float], ...]:
    """Acids and lyes whose amounts a text keeps to itself: none once cautions were read and the label matches.

    JSON holds them back from nobody: it is data, with the cautions beside it.
    """
    from fertui.workbench.carrying_out import acids_of

    said = _label(options)
    if said is not None:
        bench.acknowledge(made, said)
        return ()
    return acids_of(made)


def _label(options: Options) -> float | None:
    """The strength read off a label, once the cautions were read."""
    strength = None if options.label_strength is None else read_number(options.label_strength, "--label-strength")
    return strength if options.cautions_read else None


def release(bench: Bench, made: Any, page: Page, options: Options) -> None:
    """Write a sheet to the file asked for; one with acid only after its cautions were read and its label matches."""
    if not options.sheet:
        return
    said = _label(options)
    try:
        bench.acknowledge(made, said)
    except Refusal as no:
        how = " Say so with --cautions-read --label-strength PERCENT." if said is None else ""
        raise Refusal(f"{no}{how}") from None
    path = Path(options.sheet)
    bench.write(page.csv() if path.suffix.lower() == ".csv" else page.text, path)
