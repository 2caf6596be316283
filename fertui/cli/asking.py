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
    from fertui.site.questions import Preset, Question

NECESSARY = ("crop", "medium", "layout", "area")


def make_site(options: argparse.Namespace) -> int:
    """``new``: make the folder and its empty logbook, then say what to log first."""
    from fertui.workbench.keeping import make_new_site, new_site_questions, refuse_site_there

    folder = Path(options.dir)
    refuse_site_there(folder)
    answers = {name: value for name in NEW_OPTIONS if (value := getattr(options, name.replace("-", "_"))) is not None}
    missing = [name for name in NECESSARY if name not in answers]
    if missing and not sys.stdin.isatty():
        needed = " ".join(f"--{name}" for name in missing)
        raise Refusal(f"a new site needs {needed}. Give them as options, or run this in a terminal to be asked.")
    if missing:
        answers = _ask(new_site_questions(), answers)
    folder, steps = make_new_site(folder, answers)
    print(folder)
    _say_what_next(folder, steps)
    return FINE


def _say_what_next(folder: Path, steps: Sequence[str]) -> None:
    lines = ["Log first:", *(line for step in steps for line in _folded(step, "- "))]
    lines += [f"Open it with 'fertui {folder}'; 'fertui check {folder}' looks it over."]
    print(*lines, sep="\n", file=sys.stderr)


def _ask(questions: Sequence[Question], known: Mapping[str, str]) -> dict[str, str]:
    """Ask what is not known yet. Enter takes the default, ``?`` explains, an answer that cannot be is asked again."""
    print("Enter takes what stands in brackets, ? explains, Ctrl-C leaves without making anything.")
    answers = dict(known)
    for question in questions:
        if question.option not in answers and question.applies(answers):
            answers[question.option] = _answer(question, answers)
    print()
    return answers


def _answer(question: Question, answers: Mapping[str, str]) -> str:
    print("", *_folded(question.prompt, ""), *_offered(question.presets(answers)), sep="\n")
    while True:
        try:
            written = input(f"{question.option}{_hint(question)}: ").strip()
        except EOFError:
            raise KeyboardInterrupt from None
        if written == "?":
            print(*_folded(question.explanation, "  "), sep="\n")
            continue
        try:
            question.read(written)
        except Refusal as refusal:
            print(*_folded(str(refusal), "  "), sep="\n")
            continue
        return written


def _hint(question: Question) -> str:
    if question.default:
        return f" [{question.default}]"
    instead = f": {question.instead}" if question.instead else ""
    return f" [I do not know{instead}]" if question.may_skip else ""


def _offered(presets: Sequence[Preset]) -> list[str]:
    """The answers on offer one below the other, and the source under those that share it."""
    lines: list[str] = []
    width = max((len(preset.value) for preset in presets if len(preset.value) < 20), default=0)
    following = [each.source for each in presets[1:]] + [""]
    for preset, source_below in zip(presets, following, strict=False):
        named = f"{preset.value:{width}}  {preset.text}" if len(preset.value) < 20 else f"{preset.text}: {preset.value}"
        lines += textwrap.wrap(named.rstrip(), 80, initial_indent="  ", subsequent_indent="    ")
        if preset.source and preset.source != source_below:
            lines += _folded(f"source: {preset.source}", "    ")
    return lines


def _folded(text: str, mark: str) -> list[str]:
    return textwrap.wrap(text, 80, initial_indent=mark, subsequent_indent=" " * len(mark))
