"""The house: which heavy packages a room may load, seen from a clean interpreter for every module."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parent.parent / "fertui"
MODULES = sorted(
    ".".join(path.relative_to(PACKAGE.parent).with_suffix("").parts).removesuffix(".__init__")
    for path in PACKAGE.rglob("*.py")
    if path.name != "__main__.py"
)
LOOK = """
import sys
for name in sys.argv[1:]:
    __import__(name)
print(*sorted({"scipy", "pint", "textual", "phreeqc"} & set(sys.modules)))
"""


def loaded(*modules: str) -> set[str]:
    done = subprocess.run([sys.executable, "-c", LOOK, *modules], capture_output=True, text=True, check=True)
    return set(done.stdout.split())


@pytest.mark.parametrize("module", [m for m in MODULES if not m.startswith("fertui.tui")])
def test_no_module_of_the_core_loads_scipy_pint_or_textual(module: str) -> None:
    assert loaded(module) == set()


def test_the_terminal_interface_loads_neither_scipy_nor_pint() -> None:
    assert loaded(*[m for m in MODULES if m.startswith("fertui.tui")]) <= {"textual"}
