"""Changed procedures as text: what is done otherwise, what the engine says of it, and how to have it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from carboy.planning.repair import Mending
from carboy.reports.style import Style, wrapped

NOTHING_TO_MEND = "Nothing is to be mended here."
NOTHING_HELPS = "No change that was tried clears it. Keep the bottles apart, and ask those who know."
TITLE = "Changes that clear it, each vetted by the same engine"


def mendings_text(mendings: Sequence[Mending], style: Style, *, sound: bool, offer: str = "") -> str:
    """The section on mendings, ending in a newline. ``sound``: nothing was to be mended; ``offer``: how one of them is written to a file."""
    return style.finished("\n".join(_lines(mendings, style, sound=sound, offer=offer)) + "\n")


def _lines(mendings: Sequence[Mending], style: Style, *, sound: bool, offer: str) -> Iterator[str]:
    if not mendings:
        yield from wrapped(NOTHING_TO_MEND if sound else NOTHING_HELPS, style.width)
        return
    yield style.strong(TITLE)
    for number, mending in enumerate(mendings, start=1):
        yield ""
        lead = f" {number}  "
        yield lead + style.strong(mending.verdict.upper())
        for change in mending.changes:
            yield from wrapped(style.words(change), style.width, "    - ")
        if mending.apart:
            yield from wrapped(style.words(mending.apart), style.width, "      ")
        for condition in mending.conditions:
            yield from wrapped(style.words(f"Mind: {condition}"), style.width, "      ")
    if offer:
        yield ""
        yield from wrapped(offer, style.width)


def mending_data(mending: Mending) -> dict[str, Any]:
    """A mending for JSON: its changes in words, the report on it, and the text of its case file."""
    return {
        "changes": list(mending.changes),
        "apart": mending.apart,
        "verdict": mending.verdict,
        "report": mending.report.model_dump(mode="json"),
        "case": mending.text(),
    }
