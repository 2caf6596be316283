"""How the logbook says no."""

from __future__ import annotations

from fertui.refusals import FileTrouble, Refusal


class LogbookError(Refusal):
    """Input the logbook does not take; says what was wrong, what is allowed and what to do. Nothing was changed."""


class StoreError(FileTrouble):
    """The logbook file cannot be read or written; says which file, why and what to do. Nothing was half written."""


class DamageError(StoreError):
    """The logbook file is damaged or cut off; what can still be read of it can be saved."""
