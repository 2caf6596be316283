"""Numbers as people write them: what is taken, and in which words the rest is refused."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fertui.quantities import Number, QuantityError, parse_number
from fertui.quantities.numbers import split
from fertui.refusals import Refusal


@pytest.mark.parametrize(
    ("text", "value", "below"),
    [
        ("2.6", 2.6, False), ("2,6", 2.6, False), (" 2.6 ", 2.6, False), ("+2.6", 2.6, False), (".5", 0.5, False),
        ("5.", 5.0, False), ("0,125", 0.125, False), ("1.413", 1.413, False), ("1e-3", 0.001, False),
        ("1,5E3", 1500.0, False), ("<0.1", 0.1, True), ("< 0,01", 0.01, True), ("-0", 0.0, False),
        ("\u00a07.2", 7.2, False), ("12345", 12345.0, False), (7, 7.0, False), (7.25, 7.25, False),
        ("10,25", 10.25, False),
    ],
)  # fmt: skip
def test_taken(text, value: float, below: bool) -> None:
    assert parse_number(text) == Number(value, below)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "the value is empty"),
        ("   ", "the value is empty"),
        ("abc", "'abc' does not begin with a number"),
        ("nan", "does not begin with a number"),
        ("inf", "does not begin with a number"),
        ("-inf", "does not begin with a number"),
        (float("nan"), "'nan' does not begin with a number"),
        (float("inf"), "'inf' does not begin with a number"),
        ("1e999", "'1e999' is too large"),
        ("-1", "'-1' is negative. Allowed: 0 or more. Check the sign."),
        ("1,234", "between thousands"),
        ("1,234,567.8", "between thousands"),
        ("1 234", "between thousands"),
        ("1'234", "between thousands"),
        ("1\u00a0234", "between thousands"),
        ("1.234,5", "is not a number"),
        ("2.6.1", "is not a number"),
        ("2,6,1", "is not a number"),
        ("7 x", "leave out everything but the number"),
        (">5", "does not begin with a number"),
        ("5%", "is not a number"),
        ("7" * 10_000, "(10,000 characters) is too long"),
        ("10\u2075", "is a power"),
        ("2.6\u00b2 mS/cm", "is a power"),
        ("\u0667", "does not begin with a number"),
    ],
)
def test_refused_in_words(text, words: str) -> None:
    with pytest.raises(QuantityError) as refused:
        parse_number(text)
    message = str(refused.value)
    assert words.casefold() in message.casefold()
    assert "Allowed: " in message
    assert len(message) < 400


def test_a_refusal_is_the_programs_refusal_and_cannot_be_changed() -> None:
    with pytest.raises(Refusal) as refused:
        parse_number("x")
    error = refused.value
    assert isinstance(error, QuantityError)
    assert str(error) == f"{error.wrong}. Allowed: {error.allowed}. {error.advice[0].upper()}{error.advice[1:]}."
    with pytest.raises(AttributeError):
        error.wrong = "something else"


def test_negative_only_where_asked_for() -> None:
    assert split("-3,5", negative=True)[0].value == -3.5


@given(st.floats(0, 1e12, allow_nan=False))
def test_what_python_writes_is_read_back(value: float) -> None:
    assert parse_number(repr(value)).value == value
    assert parse_number(value).value == value


@given(st.text(max_size=80))
def test_any_text_is_a_number_or_refused(text: str) -> None:
    try:
        value = parse_number(text).value
    except QuantityError:
        return
    assert 0.0 <= value <= 1e12
