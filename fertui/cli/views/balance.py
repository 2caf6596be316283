"""How the account of a period reads."""

from __future__ import annotations

from typing import Any

from fertui.cli.views import as_json, words
from fertui.estimate.balance import Balance
from fertui.paper.page import columns, folded


def text(account: Balance, loop: str, timezone: str) -> str:
    """A row an ion, a column a cause, in mol of the whole loop; columns that are nothing everywhere are left out."""
    rows = {ion: as_json.plain(row) for ion, row in account.ions.items()}
    used = [name for name in account.columns if any(abs(row[name]) > 1e-9 for row in rows.values())]
    shown = [("mol", *(name.removesuffix("_mmol").replace("_", "-") for name in used))]
    for ion, row in rows.items():
        shown.append((ion, *(f"{row[name] / 1000:.2f}" for name in used)))
    period = f"{words.local(account.start, timezone)} to {words.local(account.end, timezone)}"
    head = [
        f"{loop}: account of {period}",
        "gains +, losses -; start + flows = end; tank, stores and root-zone solution",
        *_cut(account, timezone),
        "",
    ]
    return "\n".join(head + columns(shown, range(1, len(used) + 1)))


def _cut(account: Balance, timezone: str) -> list[str]:
    """Why the account starts later than asked."""
    if not account.is_cut:
        return []
    asked = words.local(account.asked, timezone)
    text = f"asked from {asked}, but the estimate begins {words.local(account.start, timezone)}, {account.began}"
    return folded(f"{text}; 'fertui report' holds what was logged before.", "")


def document(account: Balance, loop: str) -> dict[str, Any]:
    """The contract of ``balance --json``."""
    ions = {
        ion: {name: value for name, value in as_json.plain(row).items() if name in account.columns}
        for ion, row in account.ions.items()
    }
    return {
        "schema": "fertui.balance/1", "loop": loop, "from": account.start, "to": account.end,
        "asked_from": account.asked, "began": account.began, "ions": ions,
    }  # fmt: skip
