"""What a new site is asked about, in the order a grower knows the answers, and the answers as values."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from functools import partial
from pathlib import Path
from typing import Any, NamedTuple

from fertui.catalogue.crops import crop, crops
from fertui.catalogue.crops import targets as published_targets
from fertui.catalogue.media import media, medium
from fertui.refusals import Refusal
from fertui.site.checks import SiteError, nearest, plain
from fertui.site.model import LAYOUTS, Site
from fertui.site.new import COMMON_SALTS, machine_timezone, new_site, supply_from

UNKNOWN = ("", "?", "-", "unknown", "do not know", "don't know", "i do not know", "i don't know")
"""Answers that mean "I do not know"."""

BETWEEN_SUPPLIES = re.compile(r",(?!\d+\s*%)")
"""A comma, unless it is the decimal comma of a strength: nitric acid 59,5 %."""


class Preset(NamedTuple):
    """An answer on offer, what it means, and where its number comes from ("" where there is none)."""

    value: str
    text: str
    source: str = ""


class Question(NamedTuple):
    """One question. ``option`` is its name on the command line, ``key`` the argument of ``new_site``.

    ``default`` is what an empty answer means ("" for none); ``may_skip`` whether "I do not know" is an answer, and
    ``instead`` what is taken then. ``presets`` are the answers on offer after the answers so far (option -> text).
    """

    key: str
    option: str
    prompt: str
    explanation: str
    convert: Callable[[str], Any]
    presets: Callable[[Mapping[str, str]], tuple[Preset, ...]] = lambda answers: ()
    default: str = ""
    may_skip: bool = False
    instead: str = ""
    applies: Callable[[Mapping[str, str]], bool] = lambda answers: True

    def read(self, text: str) -> Any:
        """The value of an answer, None for "I do not know" where that is allowed and nothing is taken instead.

        Raises ``SiteError`` naming the option, what was answered and what is allowed.
        """
        said = text.strip() or self.default
        if said.lower() in UNKNOWN:
            if self.may_skip:
                return None
            raise SiteError(f"--{self.option} is missing: {self.prompt} This one has to be known.")
        try:
            return self.convert(said)
        except Refusal as trouble:
            raise SiteError(f"--{self.option} {said[:60]!r}: {trouble}") from trouble


def questions() -> tuple[Question, ...]:
    """All questions in asking order; ask one only where its ``applies`` says so of the answers (option -> text) so far.

    >>> [each.option for each in questions()][:4]
    ['crop', 'stage', 'area', 'layout']
    """
    return (
        *_about_the_crop(),
        *_about_the_loop(),
        *_about_tanks(),
        *_about_the_root_zone(),
        *_about_feeding(),
        *_about_names(),
    )


def new_site_from(folder: Path | str, answers: Mapping[str, str | None]) -> Site:
    """Make a site from answers as texts, option -> text; absent or None is "not said".

    Raises ``SiteError`` for an unknown option, a necessary answer that is missing, or one that is not allowed.
    """
    given = {option: text for option, text in answers.items() if text is not None}
    known = {each.option: each for each in questions()}
    for option in given:
        if option not in known:
            raise SiteError(f"unknown option --{option[:60]}{nearest(option, known)}; known: {', '.join(known)}.")
    asked = [each for each in known.values() if each.option in given or each.applies(given)]
    return new_site(folder, **{each.key: each.read(given.get(each.option, "")) for each in asked})


def _about_the_crop() -> tuple[Question, ...]:
    return (
        Question(
            "crop",
            "crop",
            "Which crop?",
            "Sets uptake, targets, bands and limits to start from; all of them can be changed later.",
            lambda text: crop(text).name,
            lambda answers: tuple(
                Preset(each.name, f"feed EC {each.feed.ec:g}", each.feed.shown_source) for each in crops()
            ),
        ),
        Question(
            "stage",
            "stage",
            "Which stage is it in?",
            "Shifts feed and uptake, such as more K at fruit set; log the next stage when it comes.",
            _stage,
            lambda answers: tuple(Preset(each, "") for each in _stages(answers)),
            may_skip=True,
            instead="the crop's usual feed",
            applies=lambda answers: len(_stages(answers)) > 1,
        ),
        Question(
            "area_m2",
            "area",
            "How many m2 of crop does the loop feed?",
            "The floor under this crop with the paths between its rows: crop water and uptake count per m2 of it.",
            _number(0.01, 1e7, "m2"),
        ),
    )


def _about_the_loop() -> tuple[Question, ...]:
    return (
        Question(
            "layout",
            "layout",
            "What happens to the drain?",
            "Decides whether hand doses into a tank or recipe changes in the stock correct the loop.",
            partial(_one_of, LAYOUTS),
            lambda answers: (
                Preset("shared-tank", "runs back into the tank that feeds: NFT, raft, ebb and flood"),
                Preset("drain-blend", "is collected, blended with fresh water, dosed from stock tanks: drip on slabs"),
                Preset("known-feed", "is not tracked back: run to waste, research, or only feed analyses"),
            ),
        ),
        Question(
            "medium",
            "medium",
            "What do the roots grow in?",
            "Coir and peat trade K, Ca, Mg and Na with the solution; stone wool does not.",
            lambda text: medium(text).name,
            lambda answers: tuple(Preset(each.name, each.about) for each in media()),
        ),
    )


def _about_tanks() -> tuple[Question, ...]:
    return (
        Question(
            "tank_l",
            "tank",
            "How many litres does the tank hold in use?",
            "With pipes and channels, which often hold as much again; 1-5 L per m2 is usual for NFT.",
            _number(0.1, 1e8, "L"),
            applies=lambda answers: answers.get("layout") == "shared-tank",
        ),
        Question(
            "drain_store_l",
            "drain-store",
            "How many litres does the drain store hold in use?",
            "What is in it comes back with a delay.",
            _number(0.1, 1e8, "L"),
            may_skip=True,
            instead="2.5 L per m2",
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
            _number(0.1, 1000, "L per m2"),
            _usual_volume,
            may_skip=True,
            instead="the usual",
            applies=_has_medium,
        ),
        Question(
            "root_zone_water_l_per_m2",
            "root-zone-water",
            "How many litres of water do the roots stand in, per m2?",
            "The water a slab or pot holds after it has drained, all of them on a m2 together. Hardly anyone knows it.",
            _number(0, 1000, "L per m2"),
            may_skip=True,
            instead="the volume times the water the medium holds",
            applies=_has_medium,
        ),
    )


def _about_feeding() -> tuple[Question, ...]:
    return (
        Question(
            "water",
            "water",
            "What do you call the fresh water?",
            "A name of your own. Its analysis (Na, Cl, Ca, Mg, HCO3) comes later; acid and salts depend on it.",
            str,
            lambda answers: (
                Preset("rain", "no ions in it"),
                Preset("well", "or tap, river ...: its analysis is asked for"),
            ),
            may_skip=True,
            instead="make-up water, not analysed",
        ),
        Question(
            "target",
            "target",
            "Which solution do you aim for?",
            "The crop's own, that of another crop by its name, or a published solution. Your own goes into site.toml.",
            partial(_one_of, (*published_targets(), *(each.name for each in crops()))),
            lambda answers: tuple(
                Preset(name, "published solution", each.shown_source) for name, each in published_targets().items()
            ),
            may_skip=True,
            instead="the crop's own",
        ),
        Question(
            "supplies",
            "supplies",
            "Which salts and acids are on the shelf?",
            "Names or formulas with commas between; acids with the strength on the label: nitric acid 60 %.",
            _supplies,
            lambda answers: (Preset(", ".join(COMMON_SALTS), "the common salts", "common practice, no source"),),
            may_skip=True,
            instead="the common salts, no acid",
        ),
    )


def _about_names() -> tuple[Question, ...]:
    return (
        Question(
            "loop",
            "loop",
            "What do you call this loop?",
            "Such as north or house 2.",
            str,
            may_skip=True,
            instead="the crop's name",
        ),
        Question(
            "name",
            "name",
            "What do you call the site?",
            "It stands on every sheet.",
            str,
            may_skip=True,
            instead="the folder's name",
        ),
        Question(
            "timezone",
            "timezone",
            "Which time zone?",
            "Times are shown in it and kept as UTC.",
            str,
            default=machine_timezone(),
            may_skip=True,
        ),
    )


def _stages(answers: Mapping[str, str]) -> tuple[str, ...]:
    try:
        return tuple(crop(answers.get("crop", "")).stages)
    except Refusal:
        return ()


def _stage(text: str) -> str:
    known = tuple(dict.fromkeys(stage for each in crops() for stage in each.stages))
    return _one_of(known, text)


def _usual_volume(answers: Mapping[str, str]) -> tuple[Preset, ...]:
    try:
        usual = medium(answers.get("medium", "")).volume_l_per_m2
    except Refusal:
        return ()
    return (Preset(f"{usual.mean:g}", "usual", usual.source.shown),) if usual.mean else ()


def _has_medium(answers: Mapping[str, str]) -> bool:
    try:
        return medium(answers.get("medium", "")).name != "none"
    except Refusal:
        return True


def _number(low: float, high: float, unit: str) -> Callable[[str], float]:
    def read(text: str) -> float:
        said = text.strip().removesuffix(unit).strip().replace(",", ".")
        try:
            number = float(said)
        except ValueError:
            number = float("nan")
        if not low <= number <= high:
            raise SiteError(f"a number from {plain(low)} to {plain(high)} {unit} is allowed.")
        return number

    return read


def _one_of(allowed: tuple[str, ...], text: str) -> str:
    wanted = text.strip().lower().replace(" ", "-")
    if wanted not in allowed:
        raise SiteError(f"allowed: {', '.join(allowed)}{nearest(wanted, allowed)}.")
    return wanted


def _supplies(text: str) -> tuple[str, ...]:
    names = tuple(each.strip() for each in BETWEEN_SUPPLIES.split(text) if each.strip())
    for each in names:
        supply_from(each)
    return names
