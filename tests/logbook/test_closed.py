"""Nothing leaves the site and nothing is let in: no network, no code out of data, no way out of the site folder."""

from __future__ import annotations

import ast
import subprocess
import sys
from functools import cache
from pathlib import Path

import fertui

PACKAGE = Path(fertui.__file__).parent
NETWORK = {
    "socket", "socketserver", "ssl", "http", "urllib", "ftplib", "smtplib", "poplib", "imaplib", "nntplib", "telnetlib",
    "xmlrpc", "webbrowser", "requests", "httpx", "aiohttp", "urllib3",
}  # fmt: skip
LOADERS = {"pickle", "shelve", "marshal", "dill", "cloudpickle", "yaml"}
RUNNERS = {"eval", "exec", "compile", "__import__"}


@cache
def trees() -> tuple[tuple[str, ast.AST], ...]:
    """Every module of the program, parsed."""
    paths = sorted(PACKAGE.rglob("*.py"))
    return tuple((str(path.relative_to(PACKAGE)), ast.parse(path.read_text(encoding="utf-8"))) for path in paths)


def imported(tree: ast.AST) -> set[str]:
    """Top names a module imports, anywhere in it."""
    names: set[str] = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            names |= {alias.name.split(".")[0] for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
            names.add(node.module.split(".")[0])
    return names


def test_no_module_imports_a_network_library_or_a_loader_of_code() -> None:
    found = {where: names for where, tree in trees() if (names := imported(tree) & (NETWORK | LOADERS))}
    assert found == {}
    assert len(trees()) > 50


def test_nothing_is_evaluated() -> None:
    calls = [
        (where, node.func.id)
        for where, tree in trees()
        for node in ast.walk(tree)
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id in RUNNERS
    ]
    assert calls == []


WATCHED = """
import sys

def watch(event, arguments):
    if event.startswith("socket.") and event != "socket.__new__" or event == "urllib.Request":
        raise SystemExit(f"network: {event} {arguments}")

sys.addaudithook(watch)
from datetime import UTC, datetime
from pathlib import Path
from fertui.workbench import open_site
from fertui.workbench.demo import build_demo

folder = build_demo(Path(sys.argv[1]) / "site", now=datetime(2026, 6, 1, 6, 30, tzinfo=UTC))
bench = open_site(folder)
bench.record("note", {"text": "quiet", "by": "MK"})
bench.glance()
bench.backup(Path(sys.argv[1]) / "book.jsonl")
print("quiet")
"""


def test_a_days_work_opens_no_connection(tmp_path: Path) -> None:
    done = subprocess.run([sys.executable, "-c", WATCHED, str(tmp_path)], capture_output=True, text=True, check=False)
    assert done.stdout.strip() == "quiet", done.stderr


def test_the_watch_would_notice_a_connection() -> None:
    code = WATCHED.split("from datetime")[0] + "import socket\nsocket.getaddrinfo('localhost', 1)\nprint('quiet')"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert "network: socket.getaddrinfo" in done.stderr
