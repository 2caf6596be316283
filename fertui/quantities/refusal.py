"""How a quantity is refused."""

from __future__ import annotations

from fertui.refusals import Refusal


class QuantityError(Refusal):
    """A value, unit or name that cannot be taken as written.

    ``wrong`` says what was found, ``allowed`` what would be taken, ``advice`` what to do; the message is all three.

    >>> print(QuantityError("'7;2' is not a number", "digits with one . or ,", "write 7.2"))
    '7;2' is not a number. Allowed: digits with one . or ,. Write 7.2.
    """

    def __init__(self, wrong: str, allowed: str, advice: str) -> None:
        super().__init__(wrong, allowed, advice)

    @property
    def wrong(self) -> str:
        """What was found."""
        return str(self.args[0])

    @property
    def allowed(self) -> str:
        """What would be taken."""
        return str(self.args[1])

    @property
    def advice(self) -> str:
        """What to do."""
        return str(self.args[2])

    def __str__(self) -> str:
        return f"{self.wrong}. Allowed: {self.allowed}. {self.advice[:1].upper()}{self.advice[1:]}."


def quoted(text: str) -> str:
    """The text in quotes as an error shows it, long ones cut.

    >>> quoted("7" * 100)
    "'777777777777777777777777777777...' (100 characters)"
    """
    return repr(text) if len(text) <= 30 else f"{text[:30] + '...'!r} ({len(text):,} characters)"
