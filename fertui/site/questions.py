"""What a new site is asked about, in the order a grower knows the answers, and the answers as values."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import partial
from pathlib import Path
from typing import Any, NamedTuple

from fertui.catalogue.crops import crop, crops
from fertui.catalogue.crops import targets as published_targets
from fertui.catalogue.media import media, medium
from fertui.catalogue.supplies import substances
from fertui.refusals import Refusal
from fertui.site.answers import UNKNOWN, amount, name, one_of, supplies, timezone
from fertui.site.checks import SiteError, nearest, plain
from fertui.site.model import Composition, Loop, Site
from fertui.site.new import (
    COMMON_SALTS,
    DRAIN_STORE_L_PER_M2,
    DRAIN_STORE_SOURCE,
    PURE_WATER,
    machine_timezone,
    new_site,
)
from fertui.site.presets import root_zone_water
from fertui.site.water_report import read_report, report_text

Answers = Mapping[str, str]
"""Option -> answer as understood, a text that reads back to it; "" for "I do not know"."""


class Preset(NamedTuple):
    """An answer on offer, what it means, and where its number comes from ("" where there is none)."""

    value: str
    text: str
    source: str = ""


class Question(NamedTuple):
    """One question. ``option`` is its name on the command line, ``key`` the argument of ``new_site``.

    ``convert`` reads an answer and refuses it by quoting it; ``unit`` is that of a number. ``presets`` are the answers
    on offer after the answers so far, all that is allowed where ``only_presets``. ``instead`` is what "I do not know"
    means, in words; without one an answer has to be given. ``applies``: whether it is asked after the answers so far.
    """

    key: str
    option: str
    prompt: str
    explanation: str
    convert: Callable[[str], Any] = str
    unit: str = ""
    presets: Callable[[Answers], tuple[Preset, ...]] = lambda answers: ()
    only_presets: bool = False
    instead: Callable[[Answers], str] | None = None
    applies: Callable[[Answers], bool] = lambda answers: True

    @property
    def label(self) -> str:
        """What stands before its answer."""
        return self.option.replace("-", " ")

    def read(self, text: str, answers: Answers) -> Any:
        """The value of an answer given after others, None for "I do not know" where that is allowed.

        Raises ``Refusal`` saying what was answered and what is allowed.
        """
        said = text.strip()
        if said.lower() in UNKNOWN:
            if self.instead is not None:
                return None
            raise SiteError(f"{self.prompt} This has to be known.")
        if self.only_presets:
            return one_of(tuple(each.value for each in self.presets(answers)), said)
        return self.convert(said)

    def understood(self, value: Any) -> str:
        """A value as the text that reads back to it, "" for None."""
        if value is None:
            return ""
        if isinstance(value, Composition):
            return report_text(value)
        if isinstance(value, float):
            return f"{plain(value).replace(',', '')} {self.unit}"
        return ", ".join(value) if isinstance(value, tuple) else str(value)


def questions() -> tuple[Question, ...]:
    """All questions in asking order; ask one only where its ``applies`` says so of the answers so far.

    >>> [each.option for each in questions()][:4]
    ['crop', 'stage', 'area', 'layout']
    """
    return (
        *_about_the_crop(),
        *_about_the_loop(),
        *_about_tanks(),
        *_about_the_root_zone(),
        *_about_the_water(),
        *_about_feeding(),
        *_about_names(),
    )


def new_site_from(folder: Path | str, given: Mapping[str, str | None]) -> Site:
    """Make a site from answers as people write them, option -> text; absent or None is "not said".

    Raises ``SiteError`` for an unknown option, a necessary answer that is missing, or one that is not allowed.
    """
    said = {option: text for option, text in given.items() if text is not None}
    known = [each.option for each in questions()]
    for option in said:
        if option not in known:
            raise SiteError(f"unknown option --{option[:60]}{nearest(option, known)}; known: {', '.join(known)}.")
    answers: dict[str, str] = {}
    values: dict[str, Any] = {}
    for each in questions():
        if each.option in said or each.applies(answers):
            values[each.key] = _read_option(each, said.get(each.option, ""), answers)
            answers[each.option] = each.understood(values[each.key])
    return new_site(folder, **values)


def _read_option(question: Question, text: str, answers: Answers) -> Any:
    try:
        return question.read(text, answers)
    except Refusal as trouble:
        raise SiteError(f"--{question.option}: {trouble}") from trouble


def _about_the_crop() -> tuple[Question, ...]:
    return (
        Question(
            "crop",
            "crop",
            "Which crop?",
            "Sets uptake, targets, bands and limits to start from; all of them can be changed later.",
            lambda text: crop(text).name,
            presets=lambda answers: tuple(
                Preset(each.name, f"feed EC {each.feed.ec:g}", each.feed.shown_source) for each in crops()
            ),
        ),
        Question(
            "stage",
            "stage",
            "Which stage is it in?",
            "Shifts feed and uptake, such as more K at fruit set; log the next stage when it comes.",
            presets=_stages,
            only_presets=True,
            instead=lambda answers: "standard",
            applies=lambda answers: len(_stages(answers)) > 1,
        ),
        Question(
            "area_m2",
            "area",
            "How many m2 of crop does the loop feed?",
            "The floor under this crop with the paths between its rows: crop water and uptake count per m2 of it.",
            amount("area", 0.01, 1e7, "m2 or ha"),
            "m2",
        ),
    )


def _about_the_loop() -> tuple[Question, ...]:
    return (
        Question(
            "layout",
            "layout",
            "What happens to the drain?",
            "Decides whether hand doses into a tank or recipe changes in the stock correct the loop.",
            presets=lambda answers: (
                Preset("shared-tank", "runs back into the tank that feeds: NFT, raft, ebb and flood"),
                Preset("drain-blend", "is collected, blended with make-up water, dosed from stock: drip on slabs"),
                Preset("known-feed", "is not tracked back: run to waste, research, or only feed analyses"),
            ),
            only_presets=True,
        ),
        Question(
            "medium",
            "medium",
            "What do the roots grow in?",
            "Coir and peat trade K, Ca, Mg and Na with the solution; stone wool does not.",
            lambda text: medium(text).name,
            presets=lambda answers: tuple(Preset(each.name, each.about) for each in media()),
        ),
    )


def _about_tanks() -> tuple[Question, ...]:
    return (
        Question(
            "tank_l",
            "tank",
            "How many litres does the tank hold in use?",
            "With pipes and channels, which often hold as much again; 1-5 L per m2 is usual for NFT.",
            amount("litres", 0.1, 1e8, "L or m3"),
            "L",
            applies=lambda answers: answers.get("layout") == "shared-tank",
        ),
        Question(
            "drain_store_l",
            "drain-store",
            "How many litres does the drain store hold in use?",
            "What is in it comes back with a delay.",
            amount("litres", 0.1, 1e8, "L or m3"),
            "L",
            _usual_drain_store,
            instead=_first_of(_usual_drain_store, "L"),
            applies=lambda answers: answers.get("layout") == "drain-blend",
        ),
    )


def _about_the_root_zone() -> tuple[Question, ...]:
    return (
        Question(
            "medium_volume_l_per_m2",
            "medium-volume",
            "How many litres of slab or pot stand on a m2?",
            "Length x width x height of all slabs or pots on a m2, in dm: litres.",
            amount("litres per m2", 0.1, 1000, "L/m2"),
            "L/m2",
            _usual_volume,
            instead=_first_of(_usual_volume, "L/m2"),
            applies=_has_medium,
        ),
        Question(
            "root_zone_water_l_per_m2",
            "root-zone-water",
            "How many litres of water do the roots stand in, per m2?",
            "The water a slab or pot holds after it has drained, all of them on a m2 together. Hardly anyone knows it.",
            amount("litres per m2", 0, 1000, "L/m2"),
            "L/m2",
            _usual_water,
            instead=_first_of(_usual_water, "L/m2"),
            applies=_has_medium,
        ),
    )


def _about_the_water() -> tuple[Question, ...]:
    return (
        Question(
            "water",
            "water",
            "What do you call the make-up water?",
            "The fresh water that is added. A name of your own; its report is asked for next.",
            name,
            presets=lambda answers: (
                Preset("rain", "no ions in it"),
                Preset("well", "or tap, river ...: its report is asked for"),
            ),
            instead=lambda answers: "make-up water, not analysed",
        ),
        Question(
            "water_report",
            "water-report",
            "What does its report say?",
            "Names and numbers with commas between, as it has them: pH 7.6, Ca 52 mg/L, Na 0.5, CaCO3 145 mg/L. "
            "Without a unit they are mmol/L (HCO3 meq/L, EC mS/cm). Acid and salts depend on it. A report that comes "
            "later is logged as an analysis of the source.",
            read_report,
            instead=lambda answers: "not analysed yet",
            applies=lambda answers: answers.get("water", "").lower() not in PURE_WATER,
        ),
    )


def _about_feeding() -> tuple[Question, ...]:
    return (
        Question(
            "target",
            "target",
            "Which solution do you aim for?",
            "The crop's own, that of another crop by its name, or a published solution. Your own goes into site.toml.",
            partial(one_of, (*published_targets(), *(each.name for each in crops()))),
            presets=lambda answers: tuple(
                Preset(name, "published solution", each.shown_source) for name, each in published_targets().items()
            ),
            instead=lambda answers: "the crop's own",
        ),
        Question(
            "supplies",
            "supplies",
            "Which salts and acids are on the shelf?",
            "Names or formulas with commas between; acids with the strength on the label: nitric acid 60 %. "
            f"There are {', '.join(substances())}.",
            supplies,
            presets=lambda answers: (
                Preset(", ".join(COMMON_SALTS), "the common salts", "common practice, no source"),
            ),
            instead=lambda answers: "the common salts, no acid",
        ),
    )


def _about_names() -> tuple[Question, ...]:
    return (
        Question(
            "loop",
            "loop",
            "What do you call this loop?",
            "Such as north or house 2.",
            name,
            instead=lambda answers: answers.get("crop", ""),
        ),
        Question(
            "name",
            "name",
            "What do you call the site?",
            "It stands on every sheet.",
            name,
            instead=lambda answers: "the folder's name",
        ),
        Question(
            "timezone",
            "timezone",
            "Which time zone?",
            "Times are shown in it and kept as UTC.",
            timezone,
            instead=lambda answers: machine_timezone(),
        ),
    )


def _stages(answers: Answers) -> tuple[Preset, ...]:
    if not answers.get("crop"):
        return ()
    preset = crop(answers["crop"])
    return tuple(
        Preset(stage, _changed(change), preset.stages_source.shown if change else "")
        for stage, change in preset.stages.items()
    )


def _changed(change: Mapping[str, float]) -> str:
    """What a stage changes in the feed."""
    moved = "  ".join(f"{ion} {mmol:+g}" for ion, mmol in change.items())
    return f"feed {moved} mmol/L" if moved else "the crop's usual feed"


def _usual_drain_store(answers: Answers) -> tuple[Preset, ...]:
    area = _number(answers, "area")
    litres = None if area is None else DRAIN_STORE_L_PER_M2 * area
    text = f"{DRAIN_STORE_L_PER_M2:g} L per m2"
    return () if litres is None else (Preset(f"{litres:.1f}".removesuffix(".0"), text, DRAIN_STORE_SOURCE),)


def _usual_volume(answers: Answers) -> tuple[Preset, ...]:
    if not _has_medium(answers):
        return ()
    usual = medium(answers["medium"]).volume_l_per_m2
    return (Preset(f"{usual.mean:g}", "usual", usual.source.shown),) if usual.mean else ()


def _usual_water(answers: Answers) -> tuple[Preset, ...]:
    if not _has_medium(answers):
        return ()
    volume = _number(answers, "medium-volume")
    loop = Loop("", "", 1.0, "other", medium(answers["medium"]).name, medium_volume_l_per_m2=volume)
    litres, why = root_zone_water(loop)
    held, _, source = why.partition("; ")
    return (Preset(f"{litres:.2f}", held, source),)


def _has_medium(answers: Answers) -> bool:
    return answers.get("medium", "none") != "none"


def _number(answers: Answers, option: str) -> float | None:
    """The number of an answer as understood, None where it was not known."""
    return float(answers[option].split()[0]) if answers.get(option) else None


def _first_of(presets: Callable[[Answers], tuple[Preset, ...]], unit: str) -> Callable[[Answers], str]:
    """What is taken instead of an answer: the first preset."""
    return lambda answers: "".join(f"{each.value} {unit}" for each in presets(answers)[:1])
