"""An entry from the ``name=value`` texts that forms, commands and tables deliver."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import UTC, datetime
from typing import Any

from fertui.logbook.codec import check_storable
from fertui.logbook.entries import Entry, Value
from fertui.logbook.errors import LogbookError
from fertui.logbook.kinds import KILOGRAMS, KINDS, METHODS, WRITTEN_ABOUT_EVERY_ENTRY, Kind, kind_named, nearest
from fertui.logbook.readers import field_named, read_value, supply_named, unknown_name
from fertui.logbook.sampling import at_25, check_method
from fertui.logbook.signing import initials
from fertui.logbook.times import AHEAD, EARLIEST, noon, read_moment, zone
from fertui.site.model import POINTS, Loop, Site
from fertui.site.points import point_called

POINTS_BY_LAYOUT: Mapping[str, tuple[str, ...]] = {
    "shared-tank": ("tank", "root_zone", "source", "feed", "drain"),
    "drain-blend": ("feed", "root_zone", "drain", "drain_store", "source"),
    "known-feed": ("feed", "root_zone", "drain", "source"),
}
"""Points a sample can come from; the first is meant where none is named (an analysis names it,
except in a shared tank)."""

_SITE_WIDE = ("site", "calibration")
_BLEED_FROM = {"shared-tank": "tank", "drain-blend": "drain_store", "known-feed": "drain"}
_MAY_LIE_AHEAD = ("plan",)


def entry_from_text(
    kind: str, texts: Mapping[str, str], site: Site, loop: Loop | str | None, now: datetime, *, whole: bool = True
) -> Entry:
    """The entry that ``name=value`` texts describe; nothing is written.

    Values without unit are in the canonical unit of their field; ions may be named by form (``NO3-N``, ``P2O5``).
    ``at`` defaults to ``now`` (aware); empty texts count as not given. ``loop``: a loop, its name, or None: the first.
    ``whole`` False: a half-filled form, to be asked about and not to be written; nothing is missing then.
    Raises ``LogbookError`` or another ``Refusal``, ready to be shown.
    """
    kind_named(kind)
    chosen = _loop(loop, site)
    blank = Entry(kind, "" if kind in _SITE_WIDE else chosen.name, now.astimezone(UTC), now.astimezone(UTC), by="")
    entry = _with_texts(blank, texts, site, chosen, now)
    return _complete(entry, site, chosen) if whole else entry


def corrected(old: Entry, changes: Mapping[str, str], site: Site, now: datetime, *, why: str, by: str) -> Entry:
    """The entry that supersedes ``old``: the same, with the named texts changed; an empty text takes a value out.

    Append it to record the correction. Raises as ``entry_from_text`` does, and for a correction without a reason.
    """
    if old.number is None or old.void:
        raise LogbookError("only a recorded entry that strikes no other can be corrected; record the event anew.")
    if not why.strip():
        raise LogbookError(f'a correction of entry {old.number} needs its reason: why="...".')
    if not changes:
        raise LogbookError(f"the correction of entry {old.number} changes nothing; name what was wrong, e.g. K=5.1.")
    chosen = site.loop(old.loop) if old.loop in {each.name for each in site.loops} else site.loops[0]
    entered = now.astimezone(UTC)
    base = old._replace(number=None, entered=entered, by="", supersedes=old.number, why=why.strip(), flags="")
    return _complete(_with_texts(base, {"by": by, **changes}, site, chosen, now), site, chosen)


def _with_texts(base: Entry, texts: Mapping[str, str], site: Site, loop: Loop, now: datetime) -> Entry:
    kind = KINDS[base.kind]
    given = {name.strip(): text.strip() for name, text in texts.items()}
    about = {name: given.pop(name) for name in WRITTEN_ABOUT_EVERY_ENTRY if name in given}
    if kind.name == "note" and about.get("note") and "text" not in given:
        given["text"] = about.pop("note")
    values = _merged(base.values, _values(kind, given, site, loop, now))
    entry = at_25(base._replace(values=values, **_about(kind, base, about, site, loop, now)), site)
    check_storable(entry)
    return entry


def _about(kind: Kind, base: Entry, about: Mapping[str, str], site: Site, loop: Loop, now: datetime) -> dict[str, Any]:
    changed: dict[str, Any] = {name: about[name] for name in ("by", "zone", "note", "doubtful") if name in about}
    if about.get("at"):
        changed["at"], changed["whole_day"] = _when(about["at"], kind, site, now)
    if "method" in about:
        changed["method"] = _method(about["method"])
    if "instrument" in about:
        changed["instrument"] = _instrument(about["instrument"], site)
    if "point" in about or not base.point:
        changed["point"] = _point(kind, about.get("point", ""), loop)
    return changed


def _values(kind: Kind, given: Mapping[str, str], site: Site, loop: Loop, now: datetime) -> dict[str, Value | None]:
    """Values by canonical name; None where an empty text takes one out."""
    found: dict[str, Value | None] = {}
    for name, text in given.items():
        canonical, value = named_value(kind, name, text, site, loop, now)
        if canonical in found and not _agree(found[canonical], value):
            raise LogbookError(f"{canonical} is given twice ({name} = {text!r} beside {_text(found[canonical])!r}).")
        found.setdefault(canonical, value)
    return found


def named_value(kind: Kind, name: str, text: str, site: Site, loop: Loop, now: datetime) -> tuple[str, Value | None]:
    """The canonical name that a name means, a field of the kind or a salt of a batch, and its value; None for ''.

    Raises ``LogbookError`` for a name the kind does not know or a text that is no value of it.
    """
    field = field_named(kind, name)
    if field is not None:
        return field.name, read_value(field, name, text, site, loop, now) if text else None
    if not kind.salts:
        raise unknown_name(kind, name, WRITTEN_ABOUT_EVERY_ENTRY)
    salt = supply_named(name, site)
    return salt, read_value(KILOGRAMS._replace(name=salt), salt, text, site, loop, now) if text else None


def _merged(old: Sequence[Value], new: Mapping[str, Value | None]) -> tuple[Value, ...]:
    names = [value.name for value in old]
    kept = [new.get(value.name, value) for value in old]
    return tuple(value for value in (*kept, *(new[name] for name in new if name not in names)) if value is not None)


def _agree(one: Value | None, other: Value | None) -> bool:
    """Whether two values of one name say the same (a report may give NO3 and NO3-N side by side), within 2 %."""
    if one is None or other is None or one.number is None or other.number is None:
        return one == other
    return abs(one.number - other.number) <= 0.02 * max(abs(one.number), abs(other.number))


def _text(value: Value | None) -> str:
    return "" if value is None else value.text


def _complete(entry: Entry, site: Site, loop: Loop) -> Entry:
    """The entry with what the site knows filled in; raises ``LogbookError`` for what is missing or contradicts."""
    kind = KINDS[entry.kind]
    initials(entry.by)
    missing = [field.name for field in kind.fields if field.required and entry.value(field.name) is None]
    if missing:
        example = f"{missing[0]}={_example(kind, missing[0])}"
        raise LogbookError(f"{kind.name} needs {', '.join(missing)}; for example {example}.")
    if not entry.values:
        raise LogbookError(f"{kind.name} has no value; give at least one of {', '.join(kind.names)}.")
    if kind.name == "analysis" and not entry.point:
        allowed = ", ".join(POINTS_BY_LAYOUT[loop.layout])
        where = f"where was the sample taken? Give point= (in a table, a column point): {allowed}"
        raise LogbookError(f"analysis needs its point: {where}.")
    check_method(entry, loop)
    until = entry.number_of("until")
    if until is not None and until <= entry.at.timestamp():
        raise LogbookError(f"until = {entry.text_of('until')!r} is not after the start of what is planned.")
    return _filled_in(entry, site, loop)


def _filled_in(entry: Entry, site: Site, loop: Loop) -> Entry:
    if entry.kind == "bleed" and entry.value("from") is None:
        return entry._replace(values=(*entry.values, Value("from", _BLEED_FROM[loop.layout])))
    if entry.kind == "acid" and entry.value("strength") is None:
        return entry._replace(values=(*entry.values, _strength(entry.values, site)))
    return entry


def _strength(values: Sequence[Value], site: Site) -> Value:
    """Strength of the supply where the entry does not give one: an acid without strength is no record."""
    acid = next(value.text for value in values if value.name == "acid")
    supply = next((each for each in site.supplies if each.name == acid), None)
    if supply is None or supply.strength_pct is None:
        raise LogbookError(f'acid needs strength, read off the label of {acid}; for example strength="38 %".')
    return Value("strength", f"{supply.strength_pct:g} %", supply.strength_pct, "%")


def _example(kind: Kind, name: str) -> str:
    field = kind.field(name)
    if field is None or not field.is_number:
        return field.words[0] if field is not None and field.words else '"..."'
    return f'"120 {field.unit}"' if field.unit else "7"


def _loop(loop: Loop | str | None, site: Site) -> Loop:
    if isinstance(loop, Loop):
        return loop
    try:
        return site.loop(loop)
    except KeyError as error:
        raise LogbookError(f"{error.args[0]}.") from error


def _when(text: str, kind: Kind, site: Site, now: datetime) -> tuple[datetime, bool]:
    at, whole_day = read_moment(text, site.timezone, now)
    if at > now + AHEAD and kind.name not in _MAY_LIE_AHEAD:
        raise LogbookError(
            f"at = {text!r} lies in the future (it is {now.astimezone(zone(site.timezone)):%Y-%m-%d %H:%M} here). "
            "Record what has happened; what is intended goes under the kind plan."
        )
    if at < EARLIEST:
        raise LogbookError(f"at = {text!r} is before 1970; check the year.")
    if whole_day and not kind.spans:
        here = zone(site.timezone)
        at = min(noon(at.astimezone(here).date(), here), max(at, now.astimezone(UTC)))
    return at, whole_day


def _point(kind: Kind, text: str, loop: Loop) -> str:
    allowed = POINTS_BY_LAYOUT[loop.layout]
    word = point_called(text) or text
    if not text:
        return allowed[0] if kind.sampled and (kind.name != "analysis" or loop.layout == "shared-tank") else ""
    if word not in allowed:
        wrong = f"is no point of a {loop.layout} loop" if word in POINTS else f"is not known{nearest(word, POINTS)}"
        raise LogbookError(f"point = {text!r} {wrong}. Points of {loop.name}: {', '.join(allowed)}.")
    return word


def _method(text: str) -> str:
    word = text.lower().replace(" ", "_").replace("-", "_").replace(":", "_").replace(",", ".")
    if text and word not in METHODS:
        raise LogbookError(f"method = {text!r} is not known{nearest(word, METHODS)}. Known: {', '.join(METHODS)}.")
    return word


def _instrument(text: str, site: Site) -> str:
    names = [instrument.name for instrument in site.instruments]
    if text and names and text not in names:
        raise LogbookError(f"instrument = {text!r} is not known{nearest(text, names)}. Known: {', '.join(names)}.")
    return text
