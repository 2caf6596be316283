"""The JSON that outsiders rely on: one function a command, units in the keys, times with their zone, never NaN."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Mapping
from datetime import date, datetime
from enum import Enum
from typing import Any

from fertui.estimate.points import Estimated, PointState

MICRONUTRIENTS = ("Fe", "Mn", "Zn", "B", "Cu", "Mo", "Si")


def dump(document: Mapping[str, Any]) -> str:
    """The document as text; a number that is not finite becomes null.

    >>> dump({"a": float("nan"), "b": 1.5})
    '{"a": null, "b": 1.5}'
    """
    return json.dumps(plain(document), ensure_ascii=False, allow_nan=False)


def plain(value: Any) -> Any:
    """Any result as JSON-able values: records by field, times in ISO 8601, not-finite numbers as null."""
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, (datetime, date)):
        return value.isoformat()
    if isinstance(value, Enum):
        return value.value
    names = getattr(value, "_fields", None)
    if names:
        return {name: plain(getattr(value, name)) for name in names}
    if isinstance(value, Mapping):
        return {str(key): plain(each) for key, each in value.items()}
    if isinstance(value, str) or value is None or isinstance(value, (bool, int)):
        return value
    if isinstance(value, Iterable):
        return [plain(each) for each in value]
    return plain(value.item())


def estimated(number: Estimated | None) -> dict[str, Any] | None:
    """A number with its range and band."""
    if number is None:
        return None
    return {
        "value": number.value,
        "low": number.low,
        "high": number.high,
        "band": None if number.band is None else list(number.band),
    }


def point(state: PointState) -> dict[str, Any]:
    """One point in the shape of the contract."""
    ions = {}
    for name, ion in state.ions.items():
        unit = "umol_L" if name in MICRONUTRIENTS else "mmol_L"
        ions[name] = {unit: estimated(ion.mmol_l), "share_pct": estimated(ion.share_pct)}
    return {"EC_mS_cm": estimated(state.ec), "pH": estimated(state.ph), "ions": ions}


def points(states: Mapping[str, PointState]) -> dict[str, Any]:
    """All points of a loop."""
    return {name: point(state) for name, state in states.items()}
