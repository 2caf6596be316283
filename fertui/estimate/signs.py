"""The sign of each severity: the same on screens, in text and on paper."""

SIGNS = {"act": "!!", "watch": "!", "note": "-"}
"""Signs of the watch list and of all that is held against a band."""

CAUTION_SIGNS = {"danger": SIGNS["act"], "warning": SIGNS["watch"], "note": SIGNS["note"]}
"""The same for cautions of salts and acids, by their severity in the catalogue."""

MEANINGS = {"act": "act: out, or to be done now", "watch": "watch: on its way, or in doubt", "note": "note"}

LEGEND = "\n".join(["signs:", *(f"  {SIGNS[severity]:2} {meaning}" for severity, meaning in MEANINGS.items())])
