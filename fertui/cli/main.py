"""Entry point: which command runs, and what its end means to the shell."""

from __future__ import annotations

import os
import sys
import traceback
from collections.abc import Callable, Collection, Sequence
from datetime import datetime
from pathlib import Path

from fertui.cli.exit_codes import FILE_TROUBLE, FINE, INTERNAL, REFUSED
from fertui.cli.state import state_folder
from fertui.refusals import FileTrouble, Refusal

OpenTerminal = Callable[[Path, datetime | None], int]
"""Opens the terminal interface of a site folder as of a time; returns its exit code."""


def run_command(arguments: Sequence[str] | None = None, open_terminal: OpenTerminal | None = None) -> int:
    """Run one command; returns its exit code. stdout is data, stderr is talk."""
    words = list(sys.argv[1:] if arguments is None else arguments)
    try:
        return _run(words, open_terminal)
    except Refusal as refusal:
        return _say(str(refusal), REFUSED)
    except FileTrouble as trouble:
        return _say(str(trouble), FILE_TROUBLE)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return FINE
    except OSError as trouble:
        return _say(f"{trouble.strerror or trouble}: {trouble.filename or ''}".rstrip(": "), FILE_TROUBLE)
    except KeyboardInterrupt:
        return _say("Stopped.", 130)
    except Exception:
        return _say(f"fertui met a fault of its own. What it knows is in {_log_fault()}", INTERNAL)


def _run(words: list[str], open_terminal: OpenTerminal | None) -> int:
    from fertui.cli import parser

    tree = parser.build()
    if not words:
        print(tree.format_help())
        return FINE
    if not words[0].startswith("-") and words[0] not in parser.COMMANDS:
        _refuse_slip(words[0], parser.COMMANDS)
        words.insert(0, "open")
    options = tree.parse_args(words)
    if options.version:
        from fertui import __version__

        print(f"fertui {__version__}")
        return FINE
    if options.command is None:
        raise Refusal("No command given. See 'fertui --help'.")
    from fertui.cli.commands import run

    options.open_terminal = open_terminal
    return run(options)


def _refuse_slip(word: str, commands: Collection[str]) -> None:
    """Refuse a first word that is no folder and looks like a slip of a command."""
    if Path(word).exists():
        return
    import difflib

    if near := difflib.get_close_matches(word.lower(), commands, n=1):
        raise Refusal(f"{word!r} is no command and no folder; did you mean 'fertui {near[0]}'? See 'fertui --help'.")


def _say(sentence: str, code: int) -> int:
    print(f"fertui: {sentence}", file=sys.stderr)
    return code


def _log_fault() -> Path:
    path = state_folder() / f"fault-{datetime.now():%Y%m%d-%H%M%S}.log"
    path.write_text(traceback.format_exc(), encoding="utf-8")
    return path
