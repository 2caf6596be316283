"""What the end of a command means to the shell."""

from __future__ import annotations

FINE, NO, REFUSED, FILE_TROUBLE, INTERNAL = range(5)
"""Fine; the answer is no; usage or input refused; logbook or file trouble; a fault of fertui itself."""
