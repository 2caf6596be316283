"""Writes ``logbook.txt``: sixty invented days of two loops, as the model gives them with other crops' habits and noise.

    python greenhouse_demo/make.py

The crop of the north bay is given a habit the site file does not know of: it takes more K than the preset from the
stage change on. Every number is then blurred as meters, dip sticks and laboratories do. Nothing here was measured.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from fertui.catalogue.acids import acid
from fertui.catalogue.crops import crop
from fertui.catalogue.media import medium
from fertui.catalogue.salts import salt
from fertui.chemistry.conductivity import conductivity, linearise
from fertui.chemistry.ions import INDEX, IONS, Array, vector
from fertui.loop import (
    ROOT,
    WATERS,
    Circuit,
    Drive,
    Event,
    Medium,
    Plants,
    Timeline,
    Trajectory,
    hold_ec,
    hold_ph,
    simulate,
    start,
)

SEED = 20
DAYS = 60
WATERS_OF = {
    "north bay": ("well", {"Ca": 1.3, "Mg": 0.5, "Na": 0.5, "Cl": 0.5, "SO4": 0.4, "HCO3": 2.9, "K": 0.1, "NO3": 0.0}),
    "lettuce": ("rain", {"Ca": 0.2, "Mg": 0.05, "Na": 0.15, "Cl": 0.15, "SO4": 0.1, "HCO3": 0.3}),
}
MORNING = "07:40"


@dataclass(frozen=True)
class Bay:
    """What the demo invents about one loop."""

    name: str
    circuit: Circuit
    medium: Medium
    plants: Plants
    root_mmol_l: Array
    store_mmol_l: Array
    set_ec: float
    batches: Mapping[str, Mapping[str, float]]
    batch_l: float
    crop_l_m2: tuple[float, float]
    drain_share: float
    analyses: tuple[int, ...]
    sampled: tuple[str, ...]


def main() -> None:
    """Run both loops and write what was logged of them."""
    noise = np.random.default_rng(SEED)
    light = _light(noise)
    lines = _north(light, noise) + _lettuce(light, noise)
    lines.sort(key=lambda line: (int(line.split()[0]), line.split()[1]))
    Path(__file__).with_name("logbook.txt").write_text(HEAD + "\n".join(lines) + "\n", encoding="utf-8")


HEAD = """\
# Day (0 is the last), time, loop, kind, values as 'fertui record' takes them; entered= where it was written down later.
"""


def _light(noise: np.random.Generator) -> Array:
    """Light sum of each day [J/cm2]: weather that stays for some days."""
    weather, days = 0.0, []
    for day in range(DAYS + 1):
        weather = 0.6 * weather + noise.normal(0.0, 280.0)
        days.append(np.clip(1250.0 + 5.0 * day + weather, 250.0, 2600.0))
    return np.array(days)


# The north bay: tomato on coir slabs, drain re-used through a store


def _north(light: Array, noise: np.random.Generator) -> list[str]:
    preset, coir = crop("tomato"), medium("coir")
    area, slab = 1200.0, 10.0
    capacity = 40.0 * slab * area
    root = vector(
        {
            "K": 7.6,
            "Ca": 9.4,
            "Mg": 4.2,
            "Na": 3.2,
            "NH4": 0.1,
            "NO3": 20.5,
            "Cl": 3.0,
            "SO4": 6.0,
            "H2PO4": 1.1,
            "HCO3": 0.3,
        }
    )
    bay = Bay(
        "north bay",
        Circuit("drain-blend", area, 6.5 * area, store_l=6000.0, store_max_l=10000.0),
        Medium(capacity, 10.0 ** coir.selectivity()[0]),
        _plants(preset, 3.0 * area, {}),
        root,
        root,
        2.6,
        {
            "calcium": {"calcium nitrate double salt": 62, "potassium nitrate": 36, "iron DTPA": 1.4},
            "sulfate": {
                "potassium nitrate": 33,
                "potassium sulfate": 28,
                "monopotassium phosphate": 20,
                "magnesium sulfate heptahydrate": 27,
                "monoammonium phosphate": 3,
            },
        },
        1000.0,
        (2.3, 3.6),
        0.36,
        (-59, -47, -35, -23, -13, -4),
        ("feed", "root_zone"),
    )
    plants = {0: bay.plants, 26: _plants(preset, 3.0 * area, {"K": 1.4, "Ca": 0.95, "Mg": 1.0})}
    bled = Event(27.3, "bleed", litres=3000.0, point="drain_store", reason="filter back-flush")
    lines = _logged(bay, _run(bay, plants, light, (bled,)), light, noise)
    lines += [
        '-60 08:10 "north bay" crop stage=standard by=MK',
        '-60 08:20 "north bay" setpoint EC=2.6 pH=5.5 by=MK',
        '-34 09:05 "north bay" crop stage=fruit-set by=RV note="fifth truss set"',
        '-33 14:55 "north bay" bleed litres=3000 from=drain_store reason="filter back-flush" by=RV',
        '-20 10:15 "north bay" calibration instrument="EC pen" quantity=EC standard=1.413 reading=1.43 '
        "result=good by=RV",
        '-4 09:30 "north bay" sample status=sent point=root_zone by=MK',
    ]
    return [line for line in lines if not _is_yesterdays_drain(line)]


def _is_yesterdays_drain(line: str) -> bool:
    """The operator forgot the drain of the last day."""
    return line.startswith("-1 ") and "north bay" in line and " water " in line


# The lettuce: NFT, one tank, topped up by stock to a set EC and by hand


def _lettuce(light: Array, noise: np.random.Generator) -> list[str]:
    preset = crop("lettuce")
    area = 260.0
    tank = vector(
        {
            "K": 7.4,
            "Ca": 3.4,
            "Mg": 0.9,
            "Na": 1.6,
            "NH4": 0.3,
            "NO3": 12.6,
            "Cl": 1.4,
            "SO4": 1.1,
            "H2PO4": 1.3,
            "HCO3": 0.4,
        }
    )
    bay = Bay(
        "lettuce",
        Circuit("shared-tank", area, 2000.0, mixed=True),
        Medium(),
        _plants(preset, 1.7 * area, {"K": 1.1, "Ca": 0.92, "Mg": 0.95, "SO4": 0.9}),
        tank,
        tank,
        1.8,
        {
            "lettuce calcium": {"calcium nitrate double salt": 8.6, "potassium nitrate": 5.2, "iron DTPA": 0.7},
            "lettuce sulfate": {
                "potassium nitrate": 5.6,
                "monopotassium phosphate": 3.2,
                "magnesium sulfate heptahydrate": 3.0,
                "potassium sulfate": 0.6,
            },
        },
        100.0,
        (1.5, 1.9),
        0.0,
        (-58, -44, -30, -16, -9, -2),
        ("tank",),
    )
    potassium = np.asarray([salt("potassium nitrate").mmol_per_kg.get(ion, 0.0) for ion in IONS])
    dosed = Event(39.4, "dose", ions_mmol=1.0 * potassium)
    lines = _logged(bay, _run(bay, {0: bay.plants}, light, (dosed,)), light, noise)
    return [
        *lines,
        "-60 08:30 lettuce crop stage=standard by=AN",
        "-60 08:35 lettuce setpoint EC=1.8 pH=5.8 by=AN",
        '-21 09:40 lettuce dose salt="potassium nitrate" kg=1.0 by=AN note="after the analysis"',
    ]


# What both loops share


def _plants(preset: object, reference_l_d: float, habit: Mapping[str, float]) -> Plants:
    taken, reference = preset.uptake_at(""), preset.reference  # type: ignore[attr-defined]
    multiplier = np.ones(len(IONS))
    for ion, factor in habit.items():
        multiplier[INDEX[ion]] = factor
    return Plants(vector(taken.ions), np.maximum(vector(reference.ions), 0.05), reference_l_d, multiplier)


def _strength(bay: Bay) -> Array:
    """Ions per litre drawn from each stock tank alike [mmol]: what all tanks bring together."""
    total = np.zeros(len(IONS))
    for salts in bay.batches.values():
        for name, kg in salts.items():
            per_kg = salt(name).mmol_per_kg
            total += kg / bay.batch_l * np.array([per_kg.get(ion, 0.0) for ion in IONS])
    return total


def _run(bay: Bay, plants: Mapping[int, Plants], light: Array, events: tuple[Event, ...]) -> list[Trajectory]:
    """One trajectory a day, so that what each day took can be read off."""
    state = start(bay.circuit, bay.medium, bay.root_mmol_l, bay.store_mmol_l)
    mean = vector({"K": 9.0, "Ca": 5.0, "Mg": 2.2, "Na": 2.0, "NO3": 16.0, "Cl": 1.5, "SO4": 3.5, "H2PO4": 1.4})
    mean = mean * (bay.set_ec / float(conductivity(mean)))
    ec = linearise(mean, 25.0)
    nitric = vector({"NO3": 1.0, "HCO3": -1.0})
    days = []
    for day in range(DAYS):
        crop_l = _crop_water(bay, light[day], day)
        drive = Drive(
            irrigation_l_d=crop_l / (1.0 - bay.drain_share) if bay.drain_share else 40.0 * crop_l,
            crop_l_d=crop_l,
            make_up=vector(WATERS_OF[bay.name][1]),
            holds=(hold_ph(0.4, nitric), hold_ec(bay.set_ec, _strength(bay), ec)),
            ec=ec,
        )
        today = tuple(
            Event(e.at - day, e.cause, e.ions_mmol, e.litres, e.point) for e in events if day <= e.at < day + 1
        )
        run = simulate(
            bay.circuit,
            bay.medium,
            plants[max(each for each in plants if each <= day)],
            state,
            Timeline(((0.0, drive),), today),
            [1.0],
        )
        days.append(run)
        state = run.end
    return days


def _crop_water(bay: Bay, light: float, day: int) -> float:
    young, grown = bay.crop_l_m2
    return float(bay.circuit.area_m2 * (young + (grown - young) * day / DAYS) * (0.45 + 0.55 * light / 1400.0))


def _logged(bay: Bay, days: list[Trajectory], light: Array, noise: np.random.Generator) -> list[str]:
    """The operator's lines: a round each morning, stock and acid used, batches, analyses."""
    lines = [_batch_line(bay, tank, -60) for tank in bay.batches] + _analyses(bay, days, noise)
    mixed_l = dict.fromkeys(bay.batches, bay.batch_l)
    for position, run in enumerate(days):
        day = position - DAYS
        stock_l = float(run.fluxes.cause("stock")[0].sum() / _strength(bay).sum())
        lines += _round(bay, run, day, light[position], stock_l, noise)
        for tank in mixed_l:
            mixed_l[tank] -= stock_l
            if mixed_l[tank] < 1.5 * stock_l:
                lines.append(_batch_line(bay, tank, day + 1))
                mixed_l[tank] = bay.batch_l
    return lines


def _batch_line(bay: Bay, tank: str, day: int) -> str:
    salts = " ".join(f'"{name}={kg:g}"' for name, kg in bay.batches[tank].items())
    return f'{day} 06:30 "{bay.name}" batch "tank={tank}" litres={bay.batch_l:g} {salts} by=RV'


def _round(bay: Bay, run: Trajectory, day: int, light: float, stock_l: float, noise: np.random.Generator) -> list[str]:
    """What the morning round of the day after shows, and what the day took."""
    who = "AN" if bay.name == "lettuce" else ("MK", "RV", "MK", "AN")[day % 4]
    litres = dict(zip(WATERS, run.fluxes.litres[0], strict=True))
    used = {"make_up": _blur(litres["make_up"], 0.01, noise)}
    if bay.circuit.layout == "drain-blend":
        drained = 100 * litres["drain"] / litres["irrigation"]
        used |= {
            "irrigation": _blur(litres["irrigation"], 0.01, noise),
            "drain": _blur(litres["drain"], 0.03, noise),
        }
        readings = [
            f"point=feed {_meters(run.feeds[-1][0], 5.5, 18.5, noise)}",
            f"point=drain {_meters(run.end.concentration(ROOT)[0], 5.9, None, noise)} drain_pct={drained:.0f}",
        ]
    else:
        readings = [f"point=tank {_meters(run.end.concentration(ROOT)[0], 5.9, 19.5, noise)}"]
    readings[-1] += f" light_sum={light:.0f}"
    water = " ".join(f"{name}={amount:.0f}" for name, amount in used.items())
    said = [f"water {water} source={WATERS_OF[bay.name][0]}"]
    if stock_l > 0.05:
        said += [f'stock "tank={tank}" litres={_blur(stock_l, 0.012, noise):.1f}' for tank in bay.batches]
    acid_l = float(run.fluxes.cause("acid")[0, INDEX["NO3"]] / 1000.0 / acid("nitric acid").mol_per_l(38.0))
    if acid_l > 0.005:
        said.append(f'acid "acid=nitric acid 38" litres={acid_l:.2f}')
    morning = [f'{day + 1} {MORNING} "{bay.name}" reading {each} by={who}' for each in readings]
    return morning + [f'{day} day "{bay.name}" {each} by={who}' for each in said]


def _blur(value: float, share: float, noise: np.random.Generator) -> float:
    return value * float(np.exp(noise.normal(0.0, share)))


def _meters(mmol_l: Array, ph: float, temperature_c: float | None, noise: np.random.Generator) -> str:
    """EC, pH and temperature as a hand meter shows them."""
    shown = f"EC={_ec(mmol_l, noise):.2f} pH={ph + noise.normal(0.0, 0.09):.1f}"
    return shown if temperature_c is None else f"{shown} temperature={temperature_c + noise.normal(0.0, 0.9):.1f}"


def _ec(mmol_l: Array, noise: np.random.Generator) -> float:
    return float(conductivity(mmol_l)) * 1.01 * float(np.exp(noise.normal(0.0, 0.012)))


def _analyses(bay: Bay, days: list[Trajectory], noise: np.random.Generator) -> list[str]:
    lines = []
    for sampled in bay.analyses:
        run = days[sampled + DAYS - 1]
        for point in bay.sampled:
            true = run.feeds[-1][0] if point == "feed" else run.end.concentration(ROOT)[0]
            error = np.exp(noise.normal(0.0, 0.03 if point == "feed" else 0.04, len(IONS)) + noise.normal(0.0, 0.03))
            found = dict(zip(IONS, true * error, strict=True))
            shown = " ".join(f"{ion}={_lab(value)}" for ion, value in found.items())
            late = (
                " entered=-19@10:20"
                if sampled == -23
                else f" entered={sampled + 2}@{'11:15' if sampled < -2 else '07:50'}"
            )
            lines.append(
                f'{sampled} 08:50 "{bay.name}" analysis point={point} {shown} EC={_ec(true, noise):.1f} '
                f"pH={5.4 if point == 'feed' else 5.8:.1f} lab=lab by=MK{late}"
            )
    return lines


def _lab(value: float) -> str:
    if value < 0.1:
        return '"<0.1"'
    return f"{value:.1f}" if value >= 1 else f"{value:.2f}"


if __name__ == "__main__":
    main()
