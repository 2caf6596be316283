"""Making a site: from options, or by asking in the order a grower knows the answers."""

from __future__ import annotations

import argparse
import sys
import textwrap
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from fertui.cli.main import FINE
from fertui.cli.parser import NEW_OPTIONS
from fertui.refusals import Refusal

if TYPE_CHECKING:
    from fertui.site.questions import Question

NECESSARY = ("crop", "medium", "layout", "area")


def make_site(options: argparse.Namespace) -> int:
    """``new``: make the folder and its empty logbook, then say what to log first."""
    from fertui.workbench.keeping import make_new_site, new_site_questions

    answers = {name: value for name in NEW_OPTIONS if (value := getattr(options, name.replace("-", "_"))) is not None}
    missing = [name for name in NECESSARY if name not in answers]
    if missing and not sys.stdin.isatty():
        needed = " ".join(f"--{name}" for name in missing)
        raise Refusal(f"a new site needs {needed}. Give them as options, or run this in a terminal to be asked.")
    if missing:
        answers = _ask(new_site_questions(), answers)
    folder, steps = make_new_site(Path(options.dir), answers)
    print(folder)
    print("Log first:", *(line for step in steps for line in _folded(step, "- ")), sep="\n", file=sys.stderr)
    return FINE


def _ask(questions: Sequence[Question], known: Mapping[str, str]) -> dict[str, str]:
    """Ask what is not known yet. Enter takes the default, ``?`` explains, an answer that cannot be is asked again."""
    print("Enter takes what stands in brackets, ? explains, Ctrl-C leaves without making anything.")
    answers = dict(known)
    for question in questions:
        if question.option not in answers and question.applies(answers):
            answers[question.option] = _answer(question)
    return answers


def _answer(question: Question) -> str:
    print("", *_folded(question.prompt, ""), sep="\n")
    for preset in question.presets:
        print(
            *_folded(f"{preset.value}: {preset.text}" + (f" ({preset.source})" if preset.source else ""), "  "),
            sep="\n",
        )
    hint = f" [{question.default}]" if question.default else " [I do not know]" if question.may_skip else ""
    while True:
        written = input(f"{question.option}{hint}: ").strip()
        if written == "?":
            print(*_folded(question.explanation, "  "), sep="\n")
            continue
        try:
            question.read(written)
        except Refusal as refusal:
            print(*_folded(str(refusal), "  "), sep="\n")
            continue
        return written


def _folded(text: str, mark: str) -> list[str]:
    return textwrap.wrap(text, 80, initial_indent=mark, subsequent_indent=" " * len(mark))
