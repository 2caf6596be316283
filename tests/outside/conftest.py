"""Outside judges the checks of this folder are held against."""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from phreeqc import Phreeqc

Columns = dict[str, np.ndarray]


@pytest.fixture(scope="session")
def phreeqc() -> Callable[[str, str], Columns]:
    """Runs a PHREEQC script (package phreeqc 1.1.1, engine 3.8.6) and returns its selected output by column.

    The default database is Amm.dat, where ammonium and nitrate do not meet through redox.
    """
    engines: dict[str, object] = {}

    def run(script: str, database: str = "Amm.dat") -> Columns:
        if database not in engines:
            engines[database] = Phreeqc()
            assert engines[database].LoadBuiltInDatabase(database) == 0
        engine = engines[database]
        assert engine.RunString(script) == 0, engine.GetErrorString()
        return {name: np.array(values, dtype=object) for name, values in engine.GetSelectedOutput().items()}

    return run


@pytest.fixture(scope="session")
def houses(house_folder: Path) -> list[dict[str, str]]:
    """Feed and drain analyses of two stone-wool tomato houses, as text by column; the file itself stays out of here."""
    with (house_folder / "rockwool_tomato_analyses.csv").open(newline="") as lines:
        return list(csv.DictReader(lines))
