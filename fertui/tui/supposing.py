"""What can be supposed of the days ahead, and how it is read from what was typed."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any, NamedTuple

if TYPE_CHECKING:
    from fertui.estimate.forecast import Scenario


class WhatIf(NamedTuple):
    """One thing that can be supposed: its name in a scenario, how it is asked for, its unit."""

    name: str
    words: str
    unit: str


WHAT_IFS = {
    "light": WhatIf("light_j_per_cm2_d", "light", "J/cm2 a day"), "crop": WhatIf("crop_water_l_per_m2_d",
    "crop water", "L/m2 a day"),
    "source": WhatIf("source", "source water", ""), "feed": WhatIf("feed_ec", "feed EC", "mS/cm"),
    "bleed": WhatIf("bleed_l_per_d", "bleed", "L a day"), "recipe": WhatIf("recipe", "recipe", "mmol/L"),
}  # fmt: skip


def scenario_of(supposed: Mapping[str, str]) -> Scenario:
    """The scenario that suppositions describe, read from their texts."""
    from fertui.estimate.forecast import Scenario
    from fertui.quantities import concentration, parse_number

    found: dict[str, Any] = {}
    for name, text in supposed.items():
        if name == "source":
            found[WHAT_IFS[name].name] = text
        elif name == "recipe":
            pairs = (pair.partition("=") for pair in text.replace(",", ".").split())
            found["recipe"] = dict(concentration(amount_text, ion, "mmol/L") for ion, _, amount_text in pairs)
        else:
            found[WHAT_IFS[name].name] = parse_number(text).value
    return Scenario(**found)
