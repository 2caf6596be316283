"""Does an analysis hold together? Its charges, and its ions against its EC."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from fertui.chemistry.names import IONS
from fertui.logbook.asking.question import Question
from fertui.logbook.entries import Entry

NEEDED = ("K", "Ca", "Mg", "NO3")
"""An analysis without these, or without chloride and sulfate both, says nothing by its charge balance."""


def holds_together(entry: Entry) -> Iterator[Question]:
    """One question for each failed verdict, with the misreadings that would explain it."""
    ions = ions_of(entry)
    if entry.kind != "analysis" or not all(ion in ions for ion in NEEDED) or not {"Cl", "SO4"} & ions.keys():
        return
    from fertui.chemistry.verdicts import guesses, verdicts

    perhaps = guesses(ions)
    suggestion = "; ".join(f"{ion}={number:.4g}" for ion, number in perhaps[0].instead.items()) if perhaps else ""
    explained = f" Perhaps {' or '.join(guess.what for guess in perhaps[:2])}." if perhaps else ""
    for check in verdicts(ions, entry.number_of("EC"), entry.number_of("pH")):
        if not check.passed:
            code = "ec_check" if check.what.startswith("EC") else "charge_balance"
            text = f"{check.what} {check.found}: {check.remark}.{explained}"
            yield Question(code, text, next(iter(perhaps[0].instead), "") if perhaps else "", "", suggestion)


def ions_of(entry: Entry) -> Mapping[str, float]:
    """Ions [mmol/L] of an entry by name."""
    return {value.name: value.number for value in entry.values if value.name in IONS and value.number is not None}
