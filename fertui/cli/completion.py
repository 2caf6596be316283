"""Completion scripts for bash and zsh, generated from the command tree itself."""

from __future__ import annotations

from fertui.cli.parser import build, commands_of
from fertui.logbook.kinds import KINDS


def script(shell: str) -> str:
    """A script that completes commands and their options; print it and source it.

    >>> "today" in script("bash")
    True
    """
    cases = []
    for name, parser in commands_of(build()).items():
        options = sorted(option for option in parser._option_string_actions if option.startswith("--"))
        cases.append(f'    {name}) words="{" ".join(options)}" ;;')
    body = _BODY.format(commands=" ".join(commands_of(build())), kinds=" ".join(KINDS), cases="\n".join(cases))
    return body if shell == "bash" else f"autoload -U +X bashcompinit && bashcompinit\n{body}"


_BODY = """\
_fertui() {{
  local word="${{COMP_WORDS[COMP_CWORD]}}" words=""
  if [ "$COMP_CWORD" -eq 1 ]; then words="{commands}"; fi
  if [ "${{COMP_WORDS[1]}}" = record ] && [ "$COMP_CWORD" -eq 3 ]; then
    COMPREPLY=( $(compgen -W "{kinds}" -- "$word") )
    return
  fi
  case "${{COMP_WORDS[1]}}" in
{cases}
  esac
  COMPREPLY=( $(compgen -W "$words" -- "$word") $(compgen -f -- "$word") )
}}
complete -o filenames -F _fertui fertui"""
