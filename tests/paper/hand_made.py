"""An invented site, and plans made by hand, so that what a sheet says is known beforehand."""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Any

from fertui.catalogue.cautions import cautions_of
from fertui.estimate.points import Estimated, IonState, PointState
from fertui.planning import acid_sheet, stock_sheet
from fertui.planning.acid import AcidSheet
from fertui.planning.stock import StockSheet
from fertui.planning.values import AcidStep, Binding, Outlook, Plan, RecipeChange, Renewal, Step, WhatIf
from fertui.site.model import Composition, Loop, Site, StockTank, Supply, Water
from fertui.site.presets import target_of

NOW = datetime(2026, 7, 1, 6, 0, tzinfo=UTC)
"""Wednesday morning, eight on the clock of the site."""

GUTTERS = Loop(
    name="gutters", layout="shared-tank", area_m2=260.0, crop="lettuce", medium="none", tank_l=5000.0,
    stock_tanks=("calcium", "sulfate"), water="well",
)  # fmt: skip
SLABS = GUTTERS._replace(name="slabs", layout="drain-blend", crop="tomato", medium="stone-wool", tank_l=None)
SITE = Site(
    name="Testing house",
    timezone="Europe/Amsterdam",
    loops=(GUTTERS, SLABS),
    waters=(Water("well", Composition({"Ca": 1.0, "Mg": 0.5, "HCO3": 3.5, "SO4": 0.2}, ph=7.5)),),
    supplies=(
        Supply("calcium nitrate", "calcium nitrate double salt", bag_kg=25.0),
        Supply("potassium nitrate", "potassium nitrate", bag_kg=25.0),
        Supply("MKP", "monopotassium phosphate"),
        Supply("bitter salt", "magnesium sulfate heptahydrate"),
        Supply("sodium molybdate", "sodium molybdate"),
        Supply("nitric 60", "nitric acid", strength_pct=60.0),
    ),
    stock_tanks=(StockTank("calcium", 1000.0, letter="A"), StockTank("sulfate", 1000.0, letter="B")),
)
RECIPE = target_of(SITE, SLABS)["feed"]


def stocks(**wishes: Any) -> StockSheet:
    """The stock-tank sheet of the slabs."""
    return stock_sheet(SITE, SLABS, recipe=RECIPE, **wishes)


def acid() -> AcidSheet:
    """Acid for 5 m3 of water with 3.5 meq/L of alkalinity, 0.5 to be left."""
    return acid_sheet(SITE, GUTTERS)


def point(k_share: float) -> PointState:
    """A tank in which only the K share matters."""
    known = Estimated(1.0, 0.9, 1.1)
    shares = {"K": Estimated(k_share, k_share - 4, k_share + 4, (30.0, 45.0)), "Ca": known, "Mg": known}
    ions = {ion: IonState(known, shares.get(ion)) for ion in ("K", "Ca", "Mg", "Na")}
    ions["NH4"] = IonState(Estimated(0.08, 0.05, 0.12, (None, 0.5)))
    return PointState(Estimated(2.6, 2.5, 2.7, (2.0, 3.0)), None, ions)


def hand_plan(**changes: Any) -> Plan:
    """Two weighings on one day, one two days later."""
    later = datetime(2026, 7, 3, 6, 0, tzinfo=UTC)
    plan = Plan(
        feasible=True, reason=None, loop="gutters", layout="shared-tank", at=NOW, horizon_days=14, point="tank",
        recipe=None,
        steps=(
            Step(NOW, "potassium nitrate", "KNO3", 1.75, "tank:tank", {"K": 17309.0, "NO3": 17309.0}),
            Step(NOW, "MKP", "KH2PO4", 0.4, "tank:tank", {"K": 2939.0, "H2PO4": 2939.0}),
            Step(later, "potassium nitrate", "KNO3", 1.75, "tank:tank", {"K": 17309.0, "NO3": 17309.0}),
        ),
        acid=(), acid_sheet=None, renewal=None,
        before=Outlook({"tank": point(28.0)}), after=Outlook({"tank": point(36.0)}),
        after_without=Outlook({"tank": point(24.0)}),
        binding=(Binding("EC step of a day", 0.3, "mS/cm", 0.3, "common practice"),),
        rule_of_thumb=("5.3 kg potassium nitrate at once would bring K back and lift EC to 3.1 mS/cm",),
        cautions=cautions_of([SITE.supplies[1]]),
        reasons=("potassium nitrate, not potassium sulfate: sulfate is high already",),
        arithmetic=("1.75 kg x 9891 mmol/kg / 5000 L = 3.46 mmol/L K",),
        sensitivity=(WhatIf("half done", {"K": 32.0}, 2.6, "K share 32 % at the end, inside its band"),),
    )  # fmt: skip
    return plan._replace(**changes)


def acid_step() -> AcidStep:
    """One split."""
    return AcidStep(NOW, "nitric 60", 60.0, 1.367, 0.288, "tank:tank", 15.0, 5.8, 4.5)


def renewal() -> Renewal:
    """A part renewal that costs 0.42 kg N."""
    return Renewal(2500.0, {"K": 5.0, "Ca": 3.0}, 0.42, 0.05, 4.2, {"Na": 3.0}, ())


def recipe_change() -> RecipeChange:
    """A recipe with its stock tanks."""
    return RecipeChange({"K": 8.5, "Ca": 4.0}, {"K": 15.0, "Ca": -10.0}, 2.6, (), stocks())
