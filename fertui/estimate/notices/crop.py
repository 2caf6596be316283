"""A loop without a crop: nothing is taken up, and nothing of what a crop wants is asked."""

from __future__ import annotations

from collections.abc import Iterator

from fertui.estimate.notices.look import Look
from fertui.estimate.notices.notice import NOTE, Notice


def gone(look: Look) -> Iterator[Notice]:
    """Since when no crop stands, and how the loop is told of the next one."""
    since = look.estimate.record.bare_since
    if since is not None:
        text = (
            f"No crop since {look.day(since)}: nothing is taken up, nothing is planned. Log crop, planted, "
            "when the next one stands."
        )
        yield Notice("no_crop", NOTE, text, "7")
