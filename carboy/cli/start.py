"""The console entry. It settles what must be settled before anything heavy is imported.

A run is short and what it makes lives to its end, so it is not searched for garbage on the way or on leaving.
"""

from __future__ import annotations

import gc
import os

_FRESH_OBJECTS = 400_000  # made before a search for garbage


def run() -> None:
    """Run the command line and exit."""
    gc.set_threshold(_FRESH_OBJECTS)
    os.environ.setdefault(
        "OPENBLAS_NUM_THREADS", "1"
    )  # the matrices are small: threads would only wait for one another
    from carboy.cli.main import run as commands

    try:
        commands()
    finally:
        gc.freeze()
