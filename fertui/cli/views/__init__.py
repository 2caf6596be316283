"""How each answer of the workbench reads: as plain linear text, and as the JSON outsiders rely on."""
