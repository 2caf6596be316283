"""The two ways in which fertui says no, with a sentence ready to be shown."""


class Refusal(ValueError):
    """Input refused: the message says what was wrong, where, what is allowed and what to do. Nothing was changed."""


class FileTrouble(RuntimeError):
    """The logbook or a file cannot be used: the message says which, why and what to do. Nothing was lost."""
