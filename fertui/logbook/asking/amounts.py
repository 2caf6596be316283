"""Litres and kilograms that do not fit the house: more than a tank, the shelf or the crop can take."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import timedelta

from fertui.logbook.asking.question import Question, Setting
from fertui.logbook.asking.values import TEN
from fertui.logbook.entries import Entry

MOST_L_PER_M2_D = 20.0
LEAST_L_PER_M2_D = 0.02
"""Water of a loop beyond these is asked about; 0.2 to 10 L/m2/d are met over the year (common practice, no source)."""

A_DAY = timedelta(days=1)
ROOM = 1.02
"""A tank may be this much fuller than its nominal volume before it is asked about."""


def per_area(setting: Setting) -> Iterator[Question]:
    """Litres so few for the area that they may be litres per m2, or so many that the unit may be wrong."""
    if setting.entry.kind != "water" or setting.loop is None:
        return
    for field, value, number in setting.numbers:
        per_m2 = number / setting.loop.area_m2
        if field.what != "litres" or not number or LEAST_L_PER_M2_D <= per_m2 <= MOST_L_PER_M2_D:
            continue
        few = per_m2 < LEAST_L_PER_M2_D
        hint = "Was it litres per m2, or m3?" if few else "Is the unit right?"
        text = f"{field.name} {value.text} is {per_m2:.3g} L/m2 on {setting.loop.area_m2:g} m2. {hint}"
        yield Question("per_area", text, field.name, value.text, f"{number * setting.loop.area_m2:.6g}" if few else "")


def out_by_ten(setting: Setting) -> Iterator[Question]:
    """Ten times the stock of a tank, or the acid into one, that was logged last, counted by the day; or a tenth."""
    entry, last = setting.entry, _last_alike(setting)
    litres = entry.number_of("litres")
    if entry.kind not in ("stock", "acid") or last is None or not litres:
        return
    before = last.number_of("litres") or 0.0
    since = (entry.at - last.at) / A_DAY - last.whole_day
    expected = before if entry.whole_day else before * max(1.0, since)
    if litres >= TEN[0] * expected > 0 or TEN[0] <= before / litres <= TEN[1]:
        tank, acid = entry.text_of("tank"), entry.text_of("acid")
        what = f"stock {tank}" if entry.kind == "stock" else f"{acid} into {tank}" if tank else acid
        text = f"{what}, {litres:g} L? The last was {before:g} L (entry {last.number}). Out by ten?"
        meant = litres / 10 if litres > before else litres * 10
        yield Question("out_by_ten", text, "litres", entry.text_of("litres"), f"{meant:.4g}")


def _last_alike(setting: Setting) -> Entry | None:
    """The last entry about the same stock tank, or the same acid into the same tank."""
    same = [
        each
        for each in setting.past
        if all(each.text_of(name) == setting.entry.text_of(name) for name in ("tank", "acid")) and not each.doubtful
    ]
    return next((each for each in reversed(same) if each.number_of("litres")), None)


def drain_over_irrigation(setting: Setting) -> Iterator[Question]:
    """More drain than was given."""
    drain, given = setting.entry.number_of("drain"), setting.entry.number_of("irrigation")
    if setting.entry.kind == "water" and drain is not None and given is not None and drain > given:
        text = f"drain {drain:g} L is more than irrigation {given:g} L. Are the two exchanged?"
        yield Question("drain_over_irrigation", text, "drain", setting.entry.text_of("drain"))


def over_full(setting: Setting) -> Iterator[Question]:
    """More than the tank named holds."""
    litres = setting.entry.number_of("litres")
    holds = _capacity(setting)
    if setting.entry.kind in ("level", "batch", "stock", "bleed") and litres and holds and litres > ROOM * holds:
        text = f"{litres:g} L is more than the {holds:g} L there are. Is the unit right?"
        yield Question("over_full", text, "litres", setting.entry.text_of("litres"))


def left_over(setting: Setting) -> Iterator[Question]:
    """A batch that does not say what was left in its tank."""
    if setting.entry.kind == "batch" and setting.entry.number_of("left") is None:
        text = "How much old solution was left in the tank when this was mixed? 0 if it was empty."
        yield Question("left_over", text, "left", "", "0")


def shelf(setting: Setting) -> Iterator[Question]:
    """More than there is of the supply, or less than the scale can show."""
    kg, salt = setting.entry.number_of("kg"), setting.entry.text_of("salt")
    supply = setting.supply(salt)
    if setting.entry.kind != "dose" or kg is None:
        return
    if supply is not None and supply.amount_kg is not None and kg > supply.amount_kg:
        text = f"{kg:g} kg of {salt}, but site.toml has {supply.amount_kg:g} kg of it. Is it right?"
        yield Question("shelf", text, "kg", setting.entry.text_of("kg"))


def acid(setting: Setting) -> Iterator[Question]:
    """Acid added by hand without its cautions acknowledged, or of another strength than the supply.

    Litres of a whole day without a tank are what the doser drew: nobody handled them.
    """
    entry = setting.entry
    if entry.kind != "acid":
        return
    by_hand = not entry.whole_day or entry.text_of("tank") or entry.number_of("plan")
    if by_hand and entry.text_of("cautions") != "acknowledged":
        text = "The cautions of this acid were not acknowledged. Read them on the acid sheet and the safety data sheet."
        yield Question("acid_cautions", text, "cautions", entry.text_of("cautions"), "acknowledged")
    supply, strength = setting.supply(entry.text_of("acid")), entry.number_of("strength")
    if supply is not None and supply.strength_pct and strength and abs(strength - supply.strength_pct) > 0.5:
        text = f"The label says {strength:g} %, site.toml {supply.strength_pct:g} % for {supply.name}. Which is right?"
        yield Question("acid_strength", text, "strength", entry.text_of("strength"), f"{supply.strength_pct:g}")


def _capacity(setting: Setting) -> float | None:
    loop, tank = setting.loop, setting.entry.text_of("tank")
    stock = setting.stock_tank(tank)
    if stock is not None:
        return stock.litres
    if loop is None:
        return None
    where = setting.entry.text_of("from") or tank or "tank"
    if where in ("drain_store", loop.drain_store):
        return loop.drain_store_l
    if setting.entry.kind == "bleed" and where == "drain":
        return None
    return loop.tank_l
