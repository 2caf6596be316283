"""Completion scripts for bash and zsh, generated from the command tree itself."""

from __future__ import annotations

from fertui.cli.parser import build, commands_of


def script(shell: str) -> str:
    """A script that completes commands and their options; print it and source it.

    >>> "today" in script("bash")
    True
    """
    cases = []
    for name, parser in commands_of(build()).items():
        options = sorted(option for option in parser._option_string_actions if option.startswith("--"))
        cases.append(f'    {name}) words="{" ".join(options)}" ;;')
    body = _BODY.format(commands=" ".join(commands_of(build())), cases="\n".join(cases))
    return body if shell == "bash" else f"autoload -U +X bashcompinit && bashcompinit\n{body}"


_BODY = """\
_fertui() {{
  local word="${{COMP_WORDS[COMP_CWORD]}}" words=""
  if [ "$COMP_CWORD" -eq 1 ]; then words="{commands}"; fi
  case "${{COMP_WORDS[1]}}" in
{cases}
  esac
  COMPREPLY=( $(compgen -W "$words" -- "$word") $(compgen -f -- "$word") )
}}
complete -o filenames -F _fertui fertui"""
