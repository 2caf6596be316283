"""What a careful colleague asks about an entry, one module a subject; ``questions.py`` gathers them."""
