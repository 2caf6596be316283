"""Physics of one recirculating loop on arrays: uptake, circulation, simulation, account. Knows chemistry alone."""

from fertui.loop.account import Account, Booking, Discharge, discharged, running
from fertui.loop.alkalinity import Drift, Tendency, tendency
from fertui.loop.circulation import advance, feed_composition
from fertui.loop.fluxes import CAUSE, CAUSES, WATERS, Fluxes, no_fluxes
from fertui.loop.sharing import Sharer, pooled, simulate_together
from fertui.loop.simulation import Timeline, Trajectory, apply, simulate
from fertui.loop.uptake import UPTAKE_TABLE, Kinetics, Parameter, Plants, temperature_notice, uptake
from fertui.loop.values import (
    INERT,
    ROOT,
    STORE,
    Circuit,
    Drive,
    Event,
    Hold,
    Medium,
    State,
    hold_ec,
    hold_ph,
    start,
)

__all__ = [
    "CAUSE", "CAUSES", "INERT", "ROOT", "STORE", "UPTAKE_TABLE", "WATERS",
    "Account", "Booking", "Circuit", "Discharge", "Drift", "Drive", "Event", "Fluxes", "Hold", "Kinetics", "Medium",
    "Parameter", "Plants", "Sharer", "State", "Tendency", "Timeline", "Trajectory",
    "advance", "apply", "discharged", "feed_composition", "hold_ec", "hold_ph", "no_fluxes", "pooled",
    "running", "simulate", "simulate_together", "start", "temperature_notice", "tendency", "uptake",
]  # fmt: skip
