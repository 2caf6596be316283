"""A grower's site: ``site.toml`` read, checked and written."""
