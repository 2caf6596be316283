"""The commands and their options. Examples first: each help text opens with a line that works as it stands."""

from __future__ import annotations

import argparse
import os
from collections.abc import Mapping
from typing import NoReturn

from fertui.estimate.signs import LEGEND
from fertui.refusals import Refusal

ABOUT = """\
Track the ions behind the EC of a recirculated nutrient solution, see when
K : Ca : Mg, Na or NH4 leave their band, and plan what brings them back.

  fertui demo                              look around in an invented site
  fertui new north --crop tomato --medium coir --layout drain-blend --area 1200
  fertui record north reading point=drain EC=4.1 pH=5.7 by=MK
  fertui today north                       state and what to look at, as text
  fertui north                             the terminal interface
"""
CLOSING = """\
exit codes: 0 fine, 1 the answer is no, 2 usage or input refused,
            3 logbook or file trouble, 4 internal fault
fertui advises and you decide. It is no alarm system and no controller.
"""


class Help(argparse.RawDescriptionHelpFormatter):
    """Help as wide as the terminal. argparse makes one for every argument it is told of, and would load more for it."""

    def __init__(self, prog: str) -> None:
        super().__init__(prog, width=_columns() - 2)


def _columns() -> int:
    try:
        return int(os.environ.get("COLUMNS") or os.get_terminal_size().columns)
    except (ValueError, OSError):
        return 80


class Parser(argparse.ArgumentParser):
    """An argument parser that leaves exit codes to the entry point. ``about`` says in a few words what it is for."""

    about = ""

    def error(self, message: str) -> NoReturn:
        raise Refusal(f"{message}. See '{self.prog} --help'.")


COMMANDS = frozenset(
    {
        "open", "demo", "new", "completion",
        "record", "supersede", "void", "import", "export", "backup", "restore", "given",
        "today", "analysis", "drift", "balance", "forecast", "hindcast", "plan",
        "stock", "acid", "round", "handover", "report", "logbook", "supplies", "site", "check",
    }
)  # fmt: skip
"""Every command: a first word that is none of them is a site folder."""


def build() -> Parser:
    """The whole command tree."""
    parser = Parser(
        prog="fertui",
        usage="fertui SITE\n       fertui COMMAND ...",
        epilog=CLOSING,
        formatter_class=Help,
    )
    parser.add_argument("--version", action="store_true", help="print the version")
    commands = parser.add_subparsers(
        dest="command", metavar="COMMAND", prog="fertui", parser_class=Parser, help=argparse.SUPPRESS
    )
    _site_commands(commands)
    _entry_commands(commands)
    _table_commands(commands)
    _copy_commands(commands)
    _read_commands(commands)
    _paper_commands(commands)
    parser.description = f"{ABOUT}\n{_listed(commands_of(parser))}"
    return parser


GROUPS = {
    "a site": ("demo", "new", "open", "check", "site", "supplies", "backup", "restore", "completion"),
    "what happened": ("record", "import", "supersede", "void", "logbook", "given", "export"),
    "where the loop is": ("today", "analysis", "drift", "balance"),
    "what comes": ("forecast", "plan", "hindcast"),
    "paper": ("round", "handover", "stock", "acid", "report"),
}
"""The commands as the help lists them, by what they are for."""


def _listed(parsers: Mapping[str, Parser]) -> str:
    lines = []
    for group, names in GROUPS.items():
        lines += [f"{group}:", *(f"  {name:12}{parsers[name].about}" for name in names), ""]
    return "\n".join([*lines, "'fertui COMMAND --help' has an example of each."])


def commands_of(parser: Parser) -> Mapping[str, Parser]:
    """The commands of a parser by name."""
    for action in parser._actions:
        if isinstance(action, argparse._SubParsersAction):
            return action.choices
    return {}


def _add(commands: argparse._SubParsersAction, name: str, about: str, example: str, more: str = "") -> Parser:
    parser: Parser = commands.add_parser(
        name,
        description=f"  {example}\n\n{about[0].upper()}{about[1:]}.",
        epilog=more or None,
        formatter_class=Help,
    )
    parser.about = about
    return parser


SITE = "folder of the site"
INPUTS = "forecasts from what was logged since (default), or only from what was known or planned when issued"
LOOP = "a loop by name (default: the first)"
ENTRY = """\
kinds: reading, analysis, water, level, dose, stock, batch, recipe, setpoint,
       acid, bleed, plan, crop, disinfection, calibration, sample, note

  fertui record north reading point=feed EC=2.6 pH=5.5 temperature=20 by=MK
  fertui record north water make_up=2400 irrigation=3400 drain=1000 by=MK
  fertui record north stock tank=calcium litres=24 by=MK
  fertui record north analysis point=root_zone K=5.1 Ca="400 mg/L" EC=3.9 by=MK
  fertui record north bleed litres=800 from=drain reason=sodium by=MK

Every kind takes at= (default: now), by= (default: FERTUI_OPERATOR), point=,
note= and doubtful=. A value may carry its unit: NO3-N="200 mg/L". All values of
all kinds stand in docs/command.md; an unknown one is answered with those of its
kind.

What looks odd is asked at a terminal, and n logs nothing; without one it is
logged with its open question, to be settled by supersede or void.
"""


def _site_commands(commands: argparse._SubParsersAction) -> None:
    opened = _add(commands, "open", "open the terminal interface", "fertui open north")
    opened.add_argument("site", metavar="SITE", help=SITE)
    opened.add_argument("--at", metavar="TIME", help="show the site as of that time")
    demo = _add(commands, "demo", "build an invented site and open it", "fertui demo --into demo-site")
    demo.add_argument("--into", metavar="DIR", help="where to build it (default: a fresh temporary folder)")
    demo.add_argument("--text", action="store_true", help="print today, forecast and plan instead of opening it")
    new = _add(
        commands,
        "new",
        "make a site folder from options, or by asking",
        "fertui new north --crop tomato --medium coir --layout drain-blend --area 1200",
    )
    new.add_argument("dir", metavar="DIR", help="a new folder; without options the rest is asked")
    for option, about in NEW_OPTIONS.items():
        new.add_argument(f"--{option}", metavar=option.upper().replace("-", "_"), help=about)
    _add(commands, "completion", "print a completion script for bash or zsh", "fertui completion bash").add_argument(
        "shell", choices=["bash", "zsh"], help="then: source <(fertui completion bash)"
    )


NEW_OPTIONS = {
    "crop": "crop by name, such as tomato or lettuce",
    "medium": "none, stone-wool, perlite, pumice, lapilli, coir, coir-new, peat, bark, vermiculite or zeolite",
    "layout": "shared-tank, drain-blend or known-feed",
    "area": "cropped area of the loop [m2], or with its unit: 1.2 ha",
    "tank": "shared tank [L], or with its unit: 0.7 m3",
    "drain-store": "drain store [L] (default: 2.5 L per m2)",
    "medium-volume": "slabs or pots [L per m2] (default: usual for the medium)",
    "root-zone-water": "water they hold [L per m2] (default: usual for the medium)",
    "target": "another crop by name, or hoagland-1, hoagland-2, steiner (default: the crop's own)",
    "water": "the make-up water by a name of your own; rain or pure: no ions in it",
    "water-report": "what it holds: 'Ca 52 mg/L, CaCO3 145 mg/L, pH 7.6' (default: not analysed)",
    "supplies": "salts and acids on the shelf: 'KNO3, nitric acid 60 %%' (default: the common salts)",
    "stage": "stage of the crop, such as fruit-set (default: standard)",
    "name": "name of the site (default: the folder's)",
    "loop": "name of the loop (default: the crop)",
    "timezone": "time zone such as Europe/Rome (default: this machine's)",
}


def _entry_commands(commands: argparse._SubParsersAction) -> None:
    record = _add(
        commands,
        "record",
        "append one entry to the logbook",
        "fertui record north reading point=drain EC=4.1 pH=5.7 by=MK",
        ENTRY,
    )
    record.add_argument("site", metavar="SITE", help=SITE)
    record.add_argument("kind", metavar="KIND", help="what happened, see below")
    record.add_argument("values", nargs="*", metavar="name=value", help="values of the kind")
    record.add_argument("--loop", metavar="NAME", help=LOOP)
    correct = _add(
        commands,
        "supersede",
        "correct an entry; the old one stays visible",
        'fertui supersede north 41 Ca=5.1 why="misread the report" by=MK',
    )
    correct.add_argument("site", metavar="SITE", help=SITE)
    correct.add_argument("number", metavar="NUMBER", help="number of the entry, as the logbook shows it")
    correct.add_argument("values", nargs="+", metavar="name=value", help='what is different, why="..." and by=')
    strike = _add(commands, "void", "strike an entry; it stays visible", 'fertui void north 41 why="wrong loop" by=MK')
    strike.add_argument("site", metavar="SITE", help=SITE)
    strike.add_argument("number", metavar="NUMBER", help="number of the entry, as the logbook shows it")
    strike.add_argument("values", nargs="+", metavar="name=value", help='why="..." and by=')


def _table_commands(commands: argparse._SubParsersAction) -> None:
    load = _add(commands, "import", "take in a table", "fertui import north lab.csv --as analysis --dry-run")
    load.add_argument("site", metavar="SITE", help=SITE)
    load.add_argument("file", metavar="FILE", help="CSV; the unit of a column stands in its head: K [mmol/L]")
    load.add_argument(
        "--as", dest="kind", required=True, metavar="KIND", help="kind of entry: analysis, reading, water ..."
    )
    load.add_argument("--dry-run", action="store_true", help="show each conversion and check, write nothing")
    load.add_argument("--loop", metavar="NAME", help=LOOP)
    load.add_argument("--by", metavar="INITIALS", help="who, where the table has no column 'by'")
    load.add_argument("--template", metavar="NAME", help="column mapping saved for a laboratory")
    load.add_argument("--save-template", metavar="NAME", help="save the column mapping under this name")
    load.add_argument("--json", action="store_true", help="JSON instead of text")
    export = _add(commands, "export", "write the logbook as tables, one a kind", "fertui export north --into tables")
    export.add_argument("site", metavar="SITE", help=SITE)
    export.add_argument("--into", required=True, metavar="DIR", help="folder for the tables")


def _copy_commands(commands: argparse._SubParsersAction) -> None:
    backup = _add(commands, "backup", "write the whole book verbatim", "fertui backup north north.jsonl")
    backup.add_argument("site", metavar="SITE", help=SITE)
    backup.add_argument("file", metavar="FILE", help="where to write it (JSON lines)")
    restore = _add(commands, "restore", "make a site folder from a backup", "fertui restore north.jsonl north-again")
    restore.add_argument("file", metavar="FILE", help="a backup")
    restore.add_argument("dir", metavar="DIR", help="a new folder")


def _reading(commands: argparse._SubParsersAction, name: str, about: str, example: str) -> Parser:
    parser = _add(commands, name, about, example)
    parser.add_argument("site", metavar="SITE", help=SITE)
    parser.add_argument("--loop", metavar="NAME", help=LOOP)
    parser.add_argument("--at", metavar="TIME", help="hide events later than TIME (default: now)")
    parser.add_argument("--known", metavar="TIME", help="also hide entries and corrections made after TIME")
    parser.add_argument("--json", action="store_true", help="JSON instead of text")
    return parser


def _units(parser: Parser) -> Parser:
    parser.add_argument("--unit", choices=["mmol/L", "meq/L", "mg/L"], help="unit shown (default: the site's)")
    return parser


def _period(parser: Parser) -> None:
    parser.add_argument("--from", dest="start", metavar="TIME", help="start of the period (default: 14 days before)")
    parser.add_argument("--to", dest="end", metavar="TIME", help="end of the period (default: now)")


def _read_commands(commands: argparse._SubParsersAction) -> None:
    today = _units(_reading(commands, "today", "state and what to look at", "fertui today north"))
    today.epilog = LEGEND
    _units(_reading(commands, "analysis", "last analysis against target", "fertui analysis north"))
    drift = _reading(commands, "drift", "shares, ions, EC, pH over time", "fertui drift north --days 28")
    drift.add_argument("--days", default="28", metavar="N", help="days back (default: 28)")
    _period(_reading(commands, "balance", "account of each ion by cause", "fertui balance north --from 2026-05-01"))
    forecast = _units(_reading(commands, "forecast", "the days ahead", "fertui forecast north --days 14"))
    forecast.add_argument("--days", default="14", metavar="N", help="days ahead (default: 14)")
    hindcast = _reading(commands, "hindcast", "the record of past forecasts", "fertui hindcast north --inputs planned")
    hindcast.add_argument("--inputs", choices=["logged", "planned"], default="logged", help=INPUTS)
    hindcast.add_argument("--seed", metavar="N", help="another seed for the ensemble")
    plan = _reading(commands, "plan", "what brings the ions back; records nothing", "fertui plan north --days 14")
    _units(plan)
    plan.add_argument(
        "--days", default="14", metavar="N", help="days ahead (default: 14); 0: right after mixing, the dosed tank only"
    )
    plan.add_argument("--target", metavar="NAME", help="aim for another target (default: the loop's)")
    plan.add_argument("--supplies", metavar="A,B,...", help="only these, by name or formula")
    plan.add_argument("--without", metavar="SALT", action="append", default=[], help="leave a salt out (repeatable)")
    plan.add_argument("--steps", metavar="N", help="at most so many dosing steps (1-4)")
    plan.add_argument("--salts", metavar="N", help="at most so many different salts")
    plan.add_argument("--ec-step", metavar="MS_CM", help="EC may change so much in one step of tank or feed")
    plan.add_argument("--sheet", metavar="FILE", help="write the sheet to weigh and mix from")
    plan.add_argument("--cautions-read", action="store_true", help="the cautions of acids and lyes have been read")
    plan.add_argument("--label-strength", metavar="PERCENT", help="strength read off the acid's label")


def _paper_commands(commands: argparse._SubParsersAction) -> None:
    for name, about in (("stock", "stock-tank sheet"), ("acid", "acid sheet")):
        sheet = _reading(commands, name, about, f"fertui {name} north")
        sheet.add_argument("--sheet", metavar="FILE", help="write it to a file")
        sheet.add_argument("--cautions-read", action="store_true", help="the cautions have been read")
        sheet.add_argument("--label-strength", metavar="PERCENT", help="strength read off the acid's label")
        if name == "stock":
            sheet.add_argument(
                "--crop-ends", metavar="DAYS", help="only the last mix of a crop that ends in so many days"
            )
            sheet.add_argument(
                "--left", metavar="TANK=LITRES", action="append", default=[], help="old stock left in a tank: taken off"
            )
            sheet.add_argument("--plain-water", metavar="DAYS", default="0", help="days of plain water before the end")
    _reading(commands, "round", "blank round sheet with last values", "fertui round north")
    _reading(commands, "handover", "one-page shift handover", "fertui handover north")
    _period(_reading(commands, "report", "report for consultant or auditor", "fertui report north --from 2026-05-01"))
    on = _reading(commands, "given", "what the crop was given on a day", "fertui given north --on 2026-03-04")
    on.add_argument("--on", dest="day", metavar="DATE", help="the day (default: today)")
    _reading(commands, "logbook", "every entry, struck ones too", "fertui logbook north").add_argument(
        "--kind", metavar="KIND", help="entries of one kind only"
    )
    _reading(commands, "supplies", "salts, acids, stock tanks", "fertui supplies north")
    _reading(commands, "site", "targets, bands and limits, and where each comes from", "fertui site north")
    looked_over = _reading(commands, "check", "site file, logbook, watch list, this machine", "fertui check north")
    looked_over.epilog = LEGEND
