"""The command line: plain text or JSON of what the workbench answers."""
