"""The forms that ask for a whole composition, ion by ion: a laboratory's report, a recipe."""

from __future__ import annotations

from typing import TYPE_CHECKING

from fertui.chemistry.names import IONS, MICRONUTRIENTS
from fertui.tui.forms.choices import METHODS, NOTE, TIME, points_of, usual_point
from fertui.tui.forms.spec import Asked, Group, Part, Spec

if TYPE_CHECKING:
    from fertui.site.model import Loop, Site


def ions(unit: str, entry: int = 0) -> tuple[Asked, ...]:
    """One field an ion, named by the species that its unit means: mg/L of nitrogen for nitrate and ammonium."""
    return tuple(_ion(ion, unit, entry) for ion in IONS)


def _ion(ion: str, unit: str, entry: int) -> Asked:
    if unit != "mg/L":
        return Asked(
            ion,
            "HCO3 (alkal.)" if ion == "HCO3" else "P (H2PO4)" if ion == "H2PO4" else ion,
            "meq/L" if ion == "HCO3" else unit,
            entry,
            ion=ion,
        )
    from fertui.quantities import shown_in

    written, species = shown_in(ion, unit)
    return Asked(species or ion, species or ion, written, entry, ion=ion)


def micronutrients(entry: int = 0) -> tuple[Asked, ...]:
    """One field a micronutrient."""
    return tuple(Asked(name, name, "umol/L", entry, ion=name) for name in MICRONUTRIENTS)


def analysis(site: Site, loop: Loop, unit: str) -> Spec:
    """A laboratory's report."""
    about = (
        Asked("point", "point", choices=points_of(loop), default=usual_point(loop), required=True),
        Asked("at", "sampled", words=True),
    )
    rest = (
        Asked("EC", "EC", "mS/cm"), Asked("pH", "pH"), Asked("lab", "lab", words=True), Asked("sample", "number",
        words=True),
        *_waters(site), Asked("method", "method", choices=METHODS), Asked("doubtful", "doubtful", words=True), NOTE,
    )  # fmt: skip
    groups = (
        Group("sample", about),
        Group("ions", ions(unit)),
        Group("micronutrients", micronutrients()),
        Group("report", rest),
    )
    return Spec("Analysis", (Part("analysis"),), groups, columns=2, help=ANALYSIS_HELP, unit=unit)


def _waters(site: Site) -> tuple[Asked, ...]:
    """Which water it was, for a sample of the source, where the site has more than one."""
    names = tuple(water.name for water in site.waters)
    return (Asked("source", "if source", choices=("", *names)),) if len(names) > 1 else ()


ANALYSIS_HELP = (
    "The laboratory's report. Give when the sample was taken, not when the report came: the estimate uses it at "
    "its own time. "
    "The unit beside a field is what a bare number is taken in; in an empty field u, and in any field "
    "F4, changes it everywhere: bare numbers already typed then mean the new unit and are read again. "
    "A number may carry its own unit (120 mg/L). In mg/L nitrogen, phosphorus and sulphur are meant as elements, "
    "as the field says. "
    "<0.1 means below what the laboratory can see. Charge balance and EC check show below and are looked at "
    "before saving. A report of a source water counts from its time on, for every loop that takes that water."
)


def recipe(site: Site, loop: Loop, unit: str) -> Spec:
    """A feed composition."""
    about = (Asked("name", "name", words=True), TIME)
    rest = (Asked("EC", "EC", "mS/cm"), Asked("pH", "pH"), NOTE)
    groups = (
        Group("recipe", about),
        Group("ions", ions(unit)),
        Group("micronutrients", micronutrients()),
        Group("feed", rest),
    )
    return Spec(
        "Recipe",
        (Part("recipe"),),
        groups,
        columns=2,
        help="The feed composition that the stocks carry from now on.",
        unit=unit,
    )
