"""The workbench of one site: every read and every write a front end may ask for, by name."""

from __future__ import annotations

from pathlib import Path

from fertui.workbench.papers import Papers
from fertui.workbench.writing import Writing


class Bench(Papers, Writing):
    """One site folder, opened, with everything that can be asked of it and written to it."""


def open_site(folder: str | Path) -> Bench:
    """The workbench of a site folder. Raises ``Refusal`` where there is no site in it."""
    from fertui.refusals import Refusal

    path = Path(folder)
    if not (path / "site.toml").is_file():
        raise Refusal(
            f"{path} holds no site: no site.toml in it. Make one with 'fertui new {path}', or see 'fertui demo'."
        )
    return Bench(path)
