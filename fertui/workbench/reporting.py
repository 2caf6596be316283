"""What a report adds to the account: water the crop took, and what was discharged by reason."""

from __future__ import annotations

from datetime import datetime
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from fertui.estimate.assimilation import Estimate
    from fertui.loop import Discharge


def discharges(estimate: Estimate, start: datetime, end: datetime) -> tuple[Discharge, ...]:
    """Solution let go between two times, by reason, with kg of N and P."""
    from fertui.estimate.balance import discharged

    return discharged(estimate, start, end)


def crop_water_l(estimate: Estimate, start: datetime, end: datetime) -> float | None:
    """Litres the crop took between two times, None where that is not known."""
    from fertui.estimate.balance import crop_water_l as taken

    return taken(estimate, start, end)
