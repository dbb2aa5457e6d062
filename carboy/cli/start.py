"""The console entry. Nothing heavy is imported before the memory is told to wait."""

from __future__ import annotations

import gc

_FRESH_OBJECTS = 50_000  # made before a search for garbage: a run is short, and what it makes lives to its end


def run() -> None:
    """Run the command line and exit."""
    gc.set_threshold(_FRESH_OBJECTS)
    from carboy.cli.main import run as commands

    commands()
