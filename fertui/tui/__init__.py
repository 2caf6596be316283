"""The terminal interface. Everything of the toolkit stays in this room; nothing here computes."""
