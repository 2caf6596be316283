"""The four looks: each names the same inks, so that a style sheet needs one rule for all of them.

Colours of the first three are exact entries of the 256-colour table, so that nothing shifts where true colour is
missing.
"""

from __future__ import annotations

from textual.theme import Theme

NAMES = ("dark", "light", "contrast", "terminal")

INK_VARIABLES = (
    "paper", "ink", "faint", "strong", "good", "watch", "act", "accent", "band", "bar-paper", "bar-ink", "chosen-paper",
    "chosen-ink", "field-paper", "faint-weight", "mark-weight", "chosen-weight",
)  # fmt: skip


def _theme(name: str, dark: bool, ansi: bool, **variables: str) -> Theme:
    inks = {key.replace("_", "-"): value for key, value in variables.items()}
    # The toolkit's own style sheets name these two wherever a theme uses the terminal's palette.
    inks |= {"ansi-background": variables["paper"], "ansi-foreground": variables["ink"]}
    return Theme(
        name=name, primary=variables["accent"], foreground=variables["ink"], background=variables["paper"],
        surface=variables["paper"], panel=variables["paper"], boost=variables["paper"], dark=dark, ansi=ansi,
        variables=inks,
    )  # fmt: skip


DARK = _theme(
    "dark", True, False,
    paper="#1c1c1c", ink="#c6c6c6", faint="#8a8a8a", strong="#ffffff", good="#87d787", watch="#ffd75f", act="#ff8787",
    accent="#87d7d7", band="#5f8787", bar_paper="#005f5f", bar_ink="#eeeeee", chosen_paper="#005f5f",
    chosen_ink="#ffffff",
    field_paper="#3a3a3a", faint_weight="none", mark_weight="none", chosen_weight="none",
)  # fmt: skip
LIGHT = _theme(
    "light", False, False,
    paper="#eeeeee", ink="#303030", faint="#626262", strong="#000000", good="#005f00", watch="#875f00", act="#af0000",
    accent="#005f87", band="#5f8787", bar_paper="#005f5f", bar_ink="#ffffff", chosen_paper="#afd7d7",
    chosen_ink="#000000",
    field_paper="#ffffff", faint_weight="none", mark_weight="none", chosen_weight="none",
)  # fmt: skip
CONTRAST = _theme(
    "contrast", True, False,
    paper="#000000", ink="#ffffff", faint="#d0d0d0", strong="#ffffff", good="#5fff5f", watch="#ffff00", act="#ff8787",
    accent="#5fffff", band="#ffffff", bar_paper="#ffffff", bar_ink="#000000", chosen_paper="#ffff00",
    chosen_ink="#000000",
    field_paper="#000087", faint_weight="none", mark_weight="bold", chosen_weight="bold",
)  # fmt: skip
TERMINAL = _theme(
    "terminal", True, True,
    paper="ansi_default", ink="ansi_default", faint="ansi_default", strong="ansi_default", good="ansi_green",
    watch="ansi_yellow", act="ansi_red", accent="ansi_cyan", band="ansi_cyan", bar_paper="ansi_default",
    bar_ink="ansi_default", chosen_paper="ansi_default", chosen_ink="ansi_default", field_paper="ansi_default",
    faint_weight="dim", mark_weight="bold", chosen_weight="reverse",
)  # fmt: skip
THEMES = (DARK, LIGHT, CONTRAST, TERMINAL)


def usual_theme(colours: int) -> str:
    """The theme for a terminal nobody has chosen one for: its own palette where colours are few."""
    return "dark" if colours >= 256 else "terminal"
