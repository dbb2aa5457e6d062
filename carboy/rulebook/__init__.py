"""The rule book: loading it fast, checking it, running its examples, balancing its equations."""
