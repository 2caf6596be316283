"""Making a site: from options, or by asking in the order a grower knows the answers."""

from __future__ import annotations

import argparse
import sys
import textwrap
from collections.abc import Mapping, Sequence
from contextlib import suppress
from pathlib import Path
from typing import TYPE_CHECKING

from fertui.cli.exit_codes import FINE
from fertui.cli.kept import KeptAnswers
from fertui.cli.parser import NEW_OPTIONS
from fertui.refusals import Refusal

if TYPE_CHECKING:
    from fertui.site.questions import Preset, Question

NECESSARY = ("crop", "medium", "layout", "area")
BACK = "<"
HOW = (
    "Enter takes what stands in brackets, also where you do not know. ? explains, < goes back, "
    "the up key brings back what was typed. Ctrl-C leaves, and the same command then goes on where you left."
)


def make_site(options: argparse.Namespace) -> int:
    """``new``: make the folder and its empty logbook, then say what to log first."""
    from fertui.workbench.keeping import make_new_site, new_site_questions, refuse_place

    folder = Path(options.dir)
    refuse_place(folder)
    answers = {name: value for name in NEW_OPTIONS if (value := getattr(options, name.replace("-", "_"))) is not None}
    missing = [name for name in NECESSARY if name not in answers]
    if missing and not sys.stdin.isatty():
        needed = " ".join(f"--{name}" for name in missing)
        raise Refusal(f"a new site needs {needed}. Give them as options, or run this in a terminal to be asked.")
    kept = KeptAnswers(folder)
    if missing:
        answers = _ask(new_site_questions(), answers, kept)
    folder, steps = make_new_site(folder, answers)
    kept.drop()
    print(folder)
    _say_what_next(folder, steps)
    return FINE


def _say_what_next(folder: Path, steps: Sequence[str]) -> None:
    lines = ["Log first:", *(line for step in steps for line in _folded(step, "- "))]
    lines += [f"Open it with 'fertui {folder}'; 'fertui check {folder}' looks it over."]
    print(*lines, sep="\n", file=sys.stderr)


def _ask(questions: Sequence[Question], given: Mapping[str, str], kept: KeptAnswers) -> dict[str, str]:
    """Ask what is not given, each answer checked at its question and kept from then on; returns them as understood."""
    with suppress(ImportError):
        import readline  # noqa: F401  input() then edits its line and remembers those before
    print(*_folded(HOW, ""), sep="\n")
    waiting = {**_taken_up(kept), **given}
    answers: dict[str, str] = {}
    while question := _next(questions, waiting, answers):
        answer = _answer(question, answers, waiting.pop(question.option, None))
        if answer is not None:
            answers[question.option] = answer
        elif answers:
            answers.popitem()
        kept.keep(answers)
    print()
    return answers


def _next(questions: Sequence[Question], waiting: Mapping[str, str], answers: Mapping[str, str]) -> Question | None:
    open_ones = (each for each in questions if each.option not in answers)
    return next((each for each in open_ones if each.option in waiting or each.applies(answers)), None)


def _taken_up(kept: KeptAnswers) -> Mapping[str, str]:
    """Answers of an earlier run that did not come to its end, where they are wanted."""
    answers = kept.find()
    if not answers:
        return {}
    said = "; ".join(f"{option.replace('-', ' ')} {answer}" for option, answer in answers.items() if answer)
    print("", *_folded(f"Answers kept from before: {said}.", ""), sep="\n")
    return answers if _typed("Enter goes on from there, n begins anew: ").lower() in ("", "y", "yes") else {}


def _answer(question: Question, answers: Mapping[str, str], said: str | None) -> str | None:
    """The answer as understood, None to go back; ``said``: one given beforehand, which is asked only where refused."""
    if said is None:
        print("", *_folded(question.prompt, ""), *_offered(question.presets(answers)), sep="\n")
    while True:
        written = _typed(f"{question.label}{_hint(question, answers)}: ") if said is None else said
        said = None
        if written == BACK:
            return None
        if written == "?":
            print(*_folded(question.explanation, "  "), sep="\n")
            continue
        try:
            understood = question.understood(question.read(written, answers))
        except Refusal as refusal:
            print(*_folded(f"{question.label}: {refusal}", "  "), sep="\n")
            continue
        if understood not in ("", written):
            print(*_folded(f"= {understood}", "  "), sep="\n")
        return understood


def _typed(prompt: str) -> str:
    try:
        return input(prompt).strip()
    except EOFError:
        raise KeyboardInterrupt from None


def _hint(question: Question, answers: Mapping[str, str]) -> str:
    return "" if question.instead is None else f" [{question.instead(answers)}]"


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
