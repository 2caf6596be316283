"""Can this analysis be trusted? Rows with a value, a limit and its source, and a guess at what went wrong.

A guess is offered, never applied: each stands for one way of reading the analysis that would make its charges close.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from fertui.chemistry.conductivity import conductivity
from fertui.chemistry.ions import INDEX, Array, charges, composition, imbalance_pct
from fertui.chemistry.names import ATOMIC_WEIGHT

STANDARD_METHODS = "Standard Methods 1030E (from memory)"
RIVM = "RIVM groundwater quality-control protocol"

SMALL_MEQ, MIDDLE_MEQ = 3.0, 10.0
DOUBT_PCT = 10.0
EC_RATIO = (0.9, 1.1)


class Check(NamedTuple):
    """One row of a verdict: what was looked at, its value, its limit, whether it holds."""

    what: str
    value: float
    limit: str
    unit: str
    passed: bool
    remark: str
    source: str

    @property
    def found(self) -> str:
        """Value and limit, with the digits that tell them apart.

        >>> Check("EC", 1.0566, "0.9 to 1.1", "", True, "", "").found
        '1.06, allowed 0.9 to 1.1'
        """
        return f"{f'{self.value:.2f} {self.unit}'.rstrip()}, allowed {self.limit}"


class Guess(NamedTuple):
    """A way of reading the analysis that would close its charges; offered, never applied."""

    what: str
    instead: Mapping[str, float]
    """The ions that would change and the number each would become [mmol/L; HCO3 meq/L]."""
    imbalance_pct: float
    """Charge imbalance [%] the analysis would then have."""


def verdicts(
    ions_mmol_per_l: Mapping[str, float] | Array,
    ec_measured: float | None = None,
    ph: float | None = None,
    temperature_c: float = 25.0,
) -> tuple[Check, ...]:
    """Rows on whether an analysis holds together: its charge balance, and its EC against its ions.

    ``ions_mmol_per_l``: mapping or array (10,) [mmol/L]; ``ec_measured`` [mS/cm] at ``temperature_c`` (25 as a rule);
    without it the EC row is left out. ``ph`` as measured, 5.8 where None.

    >>> rows = verdicts({"K": 6, "Ca": 5, "Mg": 2, "NO3": 15, "SO4": 2, "H2PO4": 1}, ec_measured=2.1)
    >>> [row.passed for row in rows]
    [True, True, True]
    """
    ions = composition(ions_mmol_per_l)
    rows = [_standard_methods(ions), _rivm(ions)]
    if ec_measured is not None and ec_measured > 0.0:
        rows.append(_ec_row(ions, ec_measured, 5.8 if ph is None else ph, temperature_c))
    return tuple(rows)


def allowed_imbalance_pct(cations_meq: float, anions_meq: float) -> float:
    """Charge imbalance [%] that Standard Methods 1030E accepts (from memory).

    0.2 meq/L up to a sum of anions of 3 meq/L, 2 % up to 10, 5 % above.

    >>> allowed_imbalance_pct(20.0, 20.0), round(allowed_imbalance_pct(2.0, 2.0), 1)
    (5.0, 5.0)
    """
    if anions_meq <= SMALL_MEQ:
        return 100.0 * 0.2 / max(cations_meq + anions_meq, 1e-12)
    return 2.0 if anions_meq <= MIDDLE_MEQ else 5.0


def _standard_methods(ions: Array) -> Check:
    cations, anions = (float(side) for side in charges(ions))
    imbalance, allowed = float(imbalance_pct(ions)), allowed_imbalance_pct(cations, anions)
    heavier = "cations" if imbalance > 0 else "anions"
    return Check(
        what="charge balance",
        value=imbalance,
        limit=f"-{allowed:.3g} to {allowed:.3g}",
        unit="%",
        passed=abs(imbalance) <= allowed,
        remark=f"cations {cations:.2f}, anions {anions:.2f} meq/L: {abs(cations - anions):.2f} too many {heavier}",
        source=STANDARD_METHODS,
    )


def _rivm(ions: Array) -> Check:
    imbalance = float(imbalance_pct(ions))
    return Check(
        what="charge balance, usable",
        value=imbalance,
        limit=f"-{DOUBT_PCT:g} to {DOUBT_PCT:g}",
        unit="%",
        passed=abs(imbalance) <= DOUBT_PCT,
        remark="beyond this the analysis is doubtful: ask the laboratory before using it",
        source=RIVM,
    )


def _ec_row(ions: Array, ec_measured: float, ph: float, temperature_c: float) -> Check:
    calculated = float(conductivity(ions, temperature_c, ph))
    ratio, (low, high) = calculated / ec_measured, EC_RATIO
    return Check(
        what="EC calculated / EC measured",
        value=ratio,
        limit=f"{low:g} to {high:g}",
        unit="",
        passed=low <= ratio <= high,
        remark=f"the ions make {calculated:.2f} mS/cm, {ec_measured:.2f} was measured",
        source=f"{RIVM}; {STANDARD_METHODS}",
    )


_N_PER_NO3 = ATOMIC_WEIGHT["N"] / (ATOMIC_WEIGHT["N"] + 3 * ATOMIC_WEIGHT["O"])
_HCO3_PER_CACO3 = 61.02 / 50.04

# Misreadings met in practice (common practice, no source), and what each does to the numbers when taken back.
_MISREADINGS: tuple[tuple[str, Mapping[str, float]], ...] = (
    ("NO3 was given as NO3-N", {"NO3": 1.0 / _N_PER_NO3}),
    ("NO3-N was given as NO3", {"NO3": _N_PER_NO3}),
    ("Ca was given in meq/L", {"Ca": 0.5}),
    ("Mg was given in meq/L", {"Mg": 0.5}),
    ("SO4 was given in meq/L", {"SO4": 0.5}),
    ("Ca, Mg and SO4 were given in meq/L", {"Ca": 0.5, "Mg": 0.5, "SO4": 0.5}),
    ("Ca, Mg and SO4 were given in mmol/L but read as meq/L", {"Ca": 2.0, "Mg": 2.0, "SO4": 2.0}),
    ("P was counted as 3 equivalents (PO4)", {"H2PO4": 1.0 / 3.0}),
    ("alkalinity was given in mg/L CaCO3 but read as mg/L HCO3", {"HCO3": _HCO3_PER_CACO3}),
    ("alkalinity was given in mg/L HCO3 but read as mg/L CaCO3", {"HCO3": 1.0 / _HCO3_PER_CACO3}),
)


def guesses(ions_mmol_per_l: Mapping[str, float] | Array) -> tuple[Guess, ...]:
    """Misread units or species that would bring a failed charge balance within its limit, the closest first.

    Empty when the balance holds as it is, or when no single misreading explains it. Nothing is applied.

    >>> guesses({"K": 6, "Ca": 5, "Mg": 2, "NO3": 3.389, "SO4": 2, "H2PO4": 1})[0].what
    'NO3 was given as NO3-N'
    """
    ions = composition(ions_mmol_per_l)
    if _standard_methods(ions).passed:
        return ()
    found = []
    for what, factors in _MISREADINGS:
        instead = {ion: float(ions[INDEX[ion]] * factor) for ion, factor in factors.items()}
        taken_back = ions.copy()
        taken_back[[INDEX[ion] for ion in instead]] = list(instead.values())
        if _standard_methods(taken_back).passed:
            found.append(Guess(what, instead, float(imbalance_pct(taken_back))))
    return tuple(sorted(found, key=lambda guess: abs(guess.imbalance_pct)))
