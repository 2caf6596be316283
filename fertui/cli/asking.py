"""Making a site: from options, or by asking in the order a grower knows the answers."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from fertui.cli.main import FINE
from fertui.cli.parser import NEW_OPTIONS
from fertui.refusals import Refusal

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
    print("Log first:", *(f"  {step}" for step in steps), sep="\n", file=sys.stderr)
    return FINE


def _ask(questions: Any, known: Mapping[str, str]) -> dict[str, str]:
    """Ask what is not known yet; Enter takes the default, ``?`` explains."""
    answers = dict(known)
    for question in questions:
        if question.key in answers or not question.applies(answers):
            continue
        print(f"\n{question.prompt}")
        if question.presets:
            print("  " + ", ".join(question.presets))
        answer = _answer(question)
        if answer:
            answers[question.key] = answer
    return answers


def _answer(question: Any) -> str:
    hint = f" [{question.default}]" if question.default else " [I do not know]" if question.optional else ""
    while True:
        written = input(f"  {question.unit or 'answer'}{hint}: ").strip()
        if written == "?":
            print(f"  {question.explanation}")
            continue
        answer = written or question.default
        if answer or question.optional:
            return str(answer)
        print("  This one is needed. '?' explains.")
