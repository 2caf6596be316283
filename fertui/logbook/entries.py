"""What an entry of the logbook is. Immutable; a correction is a new entry that names the one it supersedes."""

from __future__ import annotations

from datetime import datetime
from typing import NamedTuple


class Value(NamedTuple):
    """One value of an entry: as written, with unit and species, and the canonical number.

    Canonical units: mmol/L for ions, umol/L for micronutrients, meq/L for HCO3, mS/cm at 25 C, L, kg, degrees C,
    J/cm2, %; the whole list is ``kinds.UNITS``. ``number`` is None for words (salt, tank, source, reason, lab ...),
    which stand as the site spells them. ``unit`` and ``species`` are those written: ``mg/L`` and ``NO3-N``; '' where
    the canonical ones were meant. ``below`` marks ``<0.1``: number is the limit of detection.
    """

    name: str
    text: str
    number: float | None = None
    unit: str = ""
    species: str = ""
    below: bool = False

    @property
    def written(self) -> str:
        """The value as written, with its unit where that stood elsewhere (a column head, a form).

        >>> Value("K", "8,0", 8.0, "mmol/L").written, Value("K", "280 mg/L", 7.16, "mg/L").written
        ('8,0 mmol/L', '280 mg/L')
        """
        return self.text if not self.unit or self.text.endswith(self.unit) else f"{self.text} {self.unit}"

    @property
    def label(self) -> str:
        """What the written number is the number of: mg of nitrogen are not mg of nitrate.

        >>> Value("NO3", "260 mg/L", 18.6, "mg/L", "NO3-N").label, Value("SO4", "52 mg/L", 1.6, "mg/L", "S").label
        ('NO3-N', 'SO4 as S')
        """
        if self.species.startswith(self.name):
            return self.species
        return f"{self.name} as {self.species}" if self.species else self.name


class Entry(NamedTuple):
    """One line of the logbook. Times are aware and in UTC. ``number`` is None until the store gave it one.

    ``whole_day``: written without a time of day. An amount then covers that local day and ``at`` is its midnight; what
    is measured or done at a moment stands at noon. ``doubtful`` (any text): kept and shown, never assimilated.
    ``flags``: codes of the questions (``questions.py``) nobody answered when it was written, with spaces between.
    """

    kind: str
    loop: str
    at: datetime
    entered: datetime
    by: str
    values: tuple[Value, ...] = ()
    number: int | None = None
    point: str = ""
    zone: str = ""
    method: str = ""
    instrument: str = ""
    note: str = ""
    doubtful: str = ""
    supersedes: int | None = None
    why: str = ""
    void: bool = False
    whole_day: bool = False
    flags: str = ""

    def value(self, name: str) -> Value | None:
        """The value of that name, or None."""
        for value in self.values:
            if value.name == name:
                return value
        return None

    def number_of(self, name: str) -> float | None:
        """Canonical number of the value of that name, or None."""
        value = self.value(name)
        return None if value is None else value.number

    def text_of(self, name: str) -> str:
        """Text of the value of that name as written, or ''."""
        value = self.value(name)
        return "" if value is None else value.text
