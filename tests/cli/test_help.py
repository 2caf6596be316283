"""The help lists every command and kind there is, says what each argument is, and keeps to 80 columns."""

from __future__ import annotations

import re
import subprocess
from pathlib import Path

import pytest

from fertui.catalogue.crops import targets
from fertui.catalogue.media import media
from fertui.cli.completion import script
from fertui.cli.parser import COMMANDS, ENTRY, GROUPS, NEW_OPTIONS, build, commands_of
from fertui.logbook.kinds import KINDS
from fertui.site.model import LAYOUTS
from fertui.site.questions import questions


def test_every_command_stands_in_one_group_of_the_help() -> None:
    listed = [name for names in GROUPS.values() for name in names]
    assert sorted(listed) == sorted(COMMANDS) == sorted(commands_of(build()))


def test_every_kind_people_log_stands_in_the_help_of_record() -> None:
    kinds = ENTRY.split("\n\n")[0].removeprefix("kinds:")
    assert {each.strip() for each in kinds.split(",")} == set(KINDS) - {"site"}


@pytest.mark.parametrize("command", ["", *sorted(COMMANDS)])
def test_help_keeps_to_80_columns_and_explains_every_argument(command: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    parser = commands_of(build())[command] if command else build()
    assert max(map(len, parser.format_help().splitlines())) <= 80
    assert all(action.help for action in parser._actions)


def test_the_bash_script_completes_commands_and_kinds(tmp_path: Path) -> None:
    (tmp_path / "completion").write_text(script("bash"), encoding="utf-8")
    asked = (
        "source completion; COMP_WORDS=(fertui record north bat); COMP_CWORD=3; _fertui; echo ${COMPREPLY[@]};"
        "COMP_WORDS=(fertui tod); COMP_CWORD=1; _fertui; echo ${COMPREPLY[@]}"
    )
    done = subprocess.run(["bash", "-c", asked], cwd=tmp_path, capture_output=True, text=True, check=True)
    assert done.stdout.split() == ["batch", "today"]


def test_every_medium_layout_and_published_target_stands_in_the_help_of_new() -> None:
    words = re.findall(r"[a-z0-9-]+", " ".join(NEW_OPTIONS.values()))
    assert {*(each.name for each in media()), *LAYOUTS, *targets(), "rain", "pure"} <= set(words)
    assert set(NEW_OPTIONS) == {each.option for each in questions()}
