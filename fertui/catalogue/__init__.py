"""Salts, acids, media, crops and cautions: data with sources in ``*.toml``, and their readers."""
