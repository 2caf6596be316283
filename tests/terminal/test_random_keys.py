"""Random keys, as a cat on the keyboard would press them: no sequence ends the program or spoils its frame."""

from __future__ import annotations

import pytest
from conftest import frame_stands
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from pseudo_terminal import KEYS, PseudoTerminal

PRESSED = [*"123456789rawdmepnbuvxzlcfshgik?+*/ 0.,-tMjo", *(name for name in KEYS if name not in ("ctrl+q", "ctrl+z"))]
"""Everything but the keys that leave; q is left out for the same reason."""


def _walk(cat: PseudoTerminal, keys: list[str]) -> None:
    cat.type("".join(KEYS.get(key, key) for key in keys).encode())
    cat.settle()
    cat.until(lambda _: frame_stands(cat, "Demo nursery"))
    assert "fault of its own" not in cat.text, (keys, cat.text)


@settings(max_examples=200, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(keys=st.lists(st.sampled_from(PRESSED), min_size=1, max_size=12))
def test_no_sequence_of_keys_ends_it(shared_terminal: PseudoTerminal, keys: list[str]) -> None:
    _walk(shared_terminal, keys)


@pytest.mark.long
@settings(max_examples=3000, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(keys=st.lists(st.sampled_from(PRESSED), min_size=1, max_size=40))
def test_no_long_sequence_of_keys_ends_it(shared_terminal: PseudoTerminal, keys: list[str]) -> None:
    _walk(shared_terminal, keys)
