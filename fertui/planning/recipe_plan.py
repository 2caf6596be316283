"""The plan for a loop fed through stock tanks, from the request to what is shown."""

from __future__ import annotations

from fertui.estimate.assimilation import Estimate
from fertui.planning.request import Request
from fertui.planning.values import Plan


def recipe_plan(request: Request, estimate: Estimate) -> Plan:
    raise NotImplementedError
