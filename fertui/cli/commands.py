"""What each command does: ask the workbench, print what it answers. Nothing is computed here."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

from fertui.cli.confirming import confirmed, say_how_to_undo
from fertui.cli.exit_codes import FINE, NO
from fertui.cli.options import (
    Options,
    read_fields,
    read_names,
    read_number,
    read_time,
    read_unit,
    read_view,
    read_whole,
)
from fertui.cli.releasing import held_back, release
from fertui.refusals import Refusal
from fertui.workbench import Bench, open_site


def run(options: Options) -> int:
    """Run the chosen command; returns its exit code."""
    return COMMANDS[options.command](options)


def opened(options: Options) -> int:
    """``open``: the terminal interface."""
    bench = open_site(options.site)
    if options.open_terminal is None:
        raise Refusal("The terminal interface is not part of this installation; use the plain commands.")
    return int(options.open_terminal(bench.folder, read_time(bench, options.at)))


def demo(options: Options) -> int:
    """``demo``: build the invented site; show it or print it."""
    from fertui.workbench.demo import build_demo

    folder = build_demo(None if options.into is None else Path(options.into))
    if not options.text:
        print(f"The demo site is in {folder}", file=sys.stderr)
        return opened(Options(site=str(folder), at=None, open_terminal=options.open_terminal))
    from fertui.cli.views.demo import text

    print(text(open_site(folder)))
    return FINE


def new(options: Options) -> int:
    """``new``: a site from options, or by asking where there is a terminal."""
    from fertui.cli.asking import make_site

    return make_site(options)


def completion(options: Options) -> int:
    """``completion``: a script for the shell."""
    from fertui.cli.completion import script

    print(script(options.shell))
    return FINE


def record(options: Options) -> int:
    """``record``: append one entry, print it as read back; what is odd about it is asked first."""
    bench = open_site(options.site)
    fields = read_fields(options.values)
    fields.setdefault("by", os.environ.get("FERTUI_OPERATOR", ""))
    odd = bench.questions(options.kind, fields, options.loop) if fields["by"] else ()
    entry = bench.record(options.kind, fields, options.loop, asked=confirmed(odd))
    _print_entry(bench, entry)
    say_how_to_undo(entry, options.site)
    return FINE


def supersede(options: Options) -> int:
    """``supersede``: a new entry that corrects an old one."""
    bench = open_site(options.site)
    fields, why, by = _correction(options)
    number = read_whole(options.number, "NUMBER")
    odd = bench.questions_of_correction(number, fields, why, by)
    entry = bench.supersede(number, fields, why, by, asked=confirmed(odd))
    _print_entry(bench, entry)
    say_how_to_undo(entry, options.site)
    return FINE


def void(options: Options) -> int:
    """``void``: strike an entry."""
    bench = open_site(options.site)
    fields, why, by = _correction(options)
    if fields:
        raise Refusal(
            f"void takes why= and by= only, not {', '.join(fields)}. To change values use 'fertui supersede'."
        )
    _print_entry(bench, bench.void(read_whole(options.number, "NUMBER"), why, by))
    return FINE


def import_table(options: Options) -> int:
    """``import``: a table of one kind; a dry run writes nothing."""
    from fertui.cli.views import as_json

    bench = open_site(options.site)
    result = bench.import_table(
        Path(options.file),
        options.kind,
        options.loop,
        dry_run=options.dry_run,
        by=options.by or os.environ.get("FERTUI_OPERATOR"),
        template=options.template,
        save_template=options.save_template,
    )
    return _show(
        options, lambda: {"schema": "fertui.import/1", **as_json.plain(result)}, lambda: "\n".join(result.words())
    )


def export(options: Options) -> int:
    """``export``: the logbook as tables."""
    for path in open_site(options.site).export(Path(options.into)):
        print(path)
    return FINE


def backup(options: Options) -> int:
    """``backup``: the whole book, verbatim."""
    print(open_site(options.site).backup(Path(options.file)))
    return FINE


def restore(options: Options) -> int:
    """``restore``: a site folder from a backup."""
    from fertui.workbench.keeping import restore_site

    print(restore_site(Path(options.file), Path(options.dir)))
    return FINE


def today(options: Options) -> int:
    """``today``."""
    from fertui.cli.views.today import document, text

    bench, view = read_view(options)
    state = bench.today(**view)
    return _show(options, lambda: document(state), lambda: text(state, bench.site.timezone, read_unit(bench, options)))


def analysis(options: Options) -> int:
    """``analysis``."""
    from fertui.cli.views.analysis import document, text

    bench, view = read_view(options)
    found = bench.analysis(**view)
    return _show(options, lambda: document(found), lambda: text(found, bench.site.timezone, read_unit(bench, options)))


def drift(options: Options) -> int:
    """``drift``."""
    from fertui.cli.views.analysis import drift_document, drift_text

    bench, view = read_view(options)
    course = bench.drift(days=read_whole(options.days, "--days", 1, 3650), **view)
    return _show(options, lambda: drift_document(course), lambda: drift_text(course, bench.site.timezone))


def balance(options: Options) -> int:
    """``balance``."""
    from fertui.cli.views.balance import document, text

    bench, view = read_view(options)
    end = read_time(bench, options.end) or view["at"]
    account = bench.balance(view["loop"], read_time(bench, options.start), end, view["known"])
    name = bench.loop(view["loop"]).name
    return _show(options, lambda: document(account, name), lambda: text(account, name, bench.site.timezone))


def forecast(options: Options) -> int:
    """``forecast``."""
    from fertui.cli.views.forecast import document, text
    from fertui.workbench.glance import managed_point

    bench, view = read_view(options)
    ahead = bench.forecast(days=read_whole(options.days, "--days", 1, 60), **view)
    loop = bench.loop(view["loop"])
    sample = bench.next_sample(ahead, loop.name, view["known"])
    return _show(
        options,
        lambda: document(ahead, sample, loop.name),
        lambda: text(ahead, sample, loop.name, managed_point(loop), bench.site.timezone, read_unit(bench, options)),
    )


def hindcast(options: Options) -> int:
    """``hindcast``."""
    from fertui.cli.views.forecast import record_document, record_text

    bench, view = read_view(options)
    seed = None if options.seed is None else read_whole(options.seed, "--seed")
    past = bench.hindcast(inputs=options.inputs, seed=seed, **view)
    name = bench.loop(view["loop"]).name
    return _show(options, lambda: record_document(past, name), lambda: record_text(past, name, bench.site.timezone))


def plan(options: Options) -> int:
    """``plan``: exit code 1 where the answer is no."""
    from fertui.cli.views.plan import accepted_text, document, text
    from fertui.workbench.carrying_out import STANDS, nothing_new, open_steps, standing

    bench, view = read_view(options)
    made = bench.plan(days=read_whole(options.days, "--days", 0, 60), **view, **_wishes(options))
    timezone = bench.site.timezone
    accepted = open_steps(bench.open_plans(made.loop, view["at"]), made.at, timezone)
    stands = bool(standing(accepted, made.at, timezone))
    if stands and options.sheet:
        raise Refusal(STANDS)
    if options.sheet:
        release(bench, made, bench.plan_page(made), options)
    held = () if options.json else held_back(bench, made, options)
    unit = read_unit(bench, options)

    def told() -> str:
        before = accepted_text(made, accepted, stands, timezone) if accepted else ""
        return before if stands else before + text(made, timezone, unit, held)

    _show(options, lambda: document(nothing_new(made) if stands else made, accepted), told)
    return FINE if made.feasible or stands else NO


def _wishes(options: Options) -> dict[str, Any]:
    wishes: dict[str, Any] = {"target": options.target, "without": tuple(options.without)}
    wishes["supplies"] = None if options.supplies is None else read_names(options.supplies)
    wishes["steps"] = None if options.steps is None else read_whole(options.steps, "--steps", 1, 4)
    wishes["salts"] = None if options.salts is None else read_whole(options.salts, "--salts", 1, 20)
    wishes["ec_step"] = None if options.ec_step is None else read_number(options.ec_step, "--ec-step")
    return wishes


def stock(options: Options) -> int:
    """``stock``: exit code 1 where a pair of salts is refused; ``--crop-ends`` asks for the last mix alone."""
    from fertui.cli.views.sheets import last_mix_text, stock_document

    bench, view = read_view(options)
    if options.crop_ends is not None:
        from fertui.cli.views import as_json

        days, plain = read_whole(options.crop_ends, "--crop-ends"), read_whole(options.plain_water, "--plain-water")
        mixes = bench.last_mixes(days, view["loop"], plain, view["at"])
        document = {"schema": "fertui.last_mix/1", "tanks": as_json.plain(mixes)}
        return _show(options, lambda: document, lambda: last_mix_text(mixes))
    sheet = bench.stock(**view, left_l=_left(bench, options))
    page = bench.stock_page(sheet, view["loop"])
    release(bench, sheet, page, options)
    _show(options, lambda: stock_document(sheet), lambda: page.text)
    return FINE if sheet.feasible else NO


def _left(bench: Bench, options: Options) -> dict[str, float]:
    """Litres of old stock by tank."""
    left = {tank: read_number(litres, f"--left {tank}") for tank, litres in read_fields(options.left).items()}
    unknown = [tank for tank in left if tank not in bench.loop(options.loop).stock_tanks]
    if unknown:
        tanks = ", ".join(bench.loop(options.loop).stock_tanks) or "none"
        raise Refusal(f"{unknown[0]!r} is no stock tank of this loop; it has {tanks}.")
    return left


def acid(options: Options) -> int:
    """``acid``: exit code 1 where there is no dose."""
    from fertui.cli.views.sheets import acid_document

    bench, view = read_view(options)
    sheet = bench.acid(**view)
    page = bench.acid_page(sheet, view["loop"])
    release(bench, sheet, page, options)
    held = () if options.json else held_back(bench, sheet, options)
    shown = bench.acid_page(sheet, view["loop"], released=False) if held else page
    _show(options, lambda: acid_document(sheet), lambda: shown.text)
    return FINE if sheet.feasible else NO


def paper(options: Options) -> int:
    """``round``, ``handover`` and ``report``: pages of text, or their data as JSON."""
    bench, view = read_view(options)
    if options.command == "report":
        page = bench.report(view["loop"], read_time(bench, options.start), read_time(bench, options.end), view["known"])
    else:
        page = bench.round_sheet(**view) if options.command == "round" else bench.handover(**view)
    from fertui.cli.views import as_json

    schema = f"fertui.{options.command}/1"
    return _show(options, lambda: {"schema": schema, **as_json.plain(page.data)}, lambda: page.text)


def logbook(options: Options) -> int:
    """``logbook``: every entry, struck ones too."""
    from fertui.cli.views.tables import entries_document, entries_text

    bench, view = read_view(options)
    entries = bench.history(options.kind, view["loop"] if options.loop else None, view["at"])
    return _show(options, lambda: entries_document(entries), lambda: entries_text(entries, bench.site.timezone))


def given(options: Options) -> int:
    """``given``: what a loop was given on a day, and what its stock tanks held."""
    from fertui.cli.views.given import document, text

    bench, view = read_view(options)
    day = (read_time(bench, options.day) or view["at"]).astimezone(ZoneInfo(bench.site.timezone)).date()
    loop = bench.loop(view["loop"])
    found, held = bench.given(day, loop.name, view["known"]), bench.mixes_on(day, loop.name, view["known"])
    return _show(options, lambda: document(found, held, loop), lambda: text(found, held, loop, bench.site.timezone))


def supplies(options: Options) -> int:
    """``supplies``."""
    from fertui.cli.views import as_json
    from fertui.cli.views.tables import supplies_text

    bench, view = read_view(options)
    shelf, tanks = bench.supplies_rows(), bench.stock_rows(view["loop"], view["at"])
    document = {"schema": "fertui.supplies/1", "supplies": as_json.plain(shelf), "stock_tanks": as_json.plain(tanks)}
    return _show(options, lambda: document, lambda: supplies_text(shelf, tanks))


def site(options: Options) -> int:
    """``site``: every value of the site file, and what is in force for a loop, each with where it comes from."""
    from fertui.cli.views import as_json
    from fertui.cli.views.tables import aims_text, site_text

    bench, view = read_view(options)
    rows, loop = bench.site_rows(), bench.loop(view["loop"]).name
    aims = bench.aims(loop)
    document = {"schema": "fertui.site/1", "rows": as_json.plain(rows), "loop": loop, "aims": as_json.plain(aims)}
    return _show(options, lambda: document, lambda: f"{site_text(rows)}\n\n{aims_text(aims, loop)}")


def check(options: Options) -> int:
    """``check``: exit code 1 where there is something to look at."""
    from fertui.cli.views import as_json
    from fertui.cli.views.tables import check_text

    rows = open_site(options.site).check()
    _show(options, lambda: {"schema": "fertui.check/1", "rows": as_json.plain(rows)}, lambda: check_text(rows))
    return FINE if all(row.passed for row in rows) else NO


COMMANDS: Mapping[str, Callable[[Options], int]] = {
    "open": opened, "demo": demo, "new": new, "completion": completion,
    "record": record, "supersede": supersede, "void": void, "import": import_table, "export": export,
    "backup": backup, "restore": restore,
    "today": today, "analysis": analysis, "drift": drift, "balance": balance, "forecast": forecast,
    "hindcast": hindcast, "plan": plan, "stock": stock, "acid": acid, "round": paper, "handover": paper,
    "report": paper, "logbook": logbook, "given": given, "supplies": supplies, "site": site, "check": check,
}  # fmt: skip


def _show(options: Options, document: Callable[[], dict[str, Any]], text: Callable[[], str]) -> int:
    from fertui.cli.views import as_json

    print(as_json.dump(document()) if options.json else text())
    return FINE


def _correction(options: Options) -> tuple[dict[str, str], str, str]:
    fields = read_fields(options.values)
    why, by = fields.pop("why", ""), fields.pop("by", os.environ.get("FERTUI_OPERATOR", ""))
    return fields, why, by


def _print_entry(bench: Bench, entry: Any) -> None:
    from fertui.cli.views.tables import entry_text

    print(entry_text(entry, bench.site.timezone))
