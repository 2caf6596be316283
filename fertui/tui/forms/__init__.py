"""Entry forms: one for every kind of entry, all of one make."""
