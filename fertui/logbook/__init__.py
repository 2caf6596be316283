"""What happened: append-only entries in SQLite, import, export, backup."""
