"""Small tables of text: columns as wide as their longest entry, nothing drawn but spaces, long cells wrapped."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from itertools import zip_longest

from carboy.reports.style import columns_of, wrapped

GAP = 2
_LEAST = 16  # columns that a wrapped last cell needs


def table(
    rows: Sequence[Sequence[str]], width: int, *, indent: int = 0, limits: Mapping[int, int] | None = None
) -> Iterator[str]:
    """Lines of a table.

    ``limits`` caps the width of columns (place from 0 -> columns); what is longer is wrapped within its cell. The last
    column takes what is left of ``width``, or stands below the others where that is too little.
    """
    if not rows:
        return
    count = max(len(row) for row in rows)
    cells = [[*row, *[""] * (count - len(row))] for row in rows]
    widths = [max(columns_of(row[place]) for row in cells) for place in range(count)]
    for place, most in (limits or {}).items():
        if place < count:
            widths[place] = min(widths[place], most)
    before = indent + sum(widths[:-1]) + GAP * (count - 1)
    below = widths[-1] > width - before and width - before < _LEAST
    for row in cells:
        parts = [list(wrapped(cell, widths[place])) for place, cell in enumerate(row[:-1])]
        if not below:
            parts.append(list(wrapped(row[-1], max(width - before, _LEAST))))
        for line in zip_longest(*parts, fillvalue=""):
            yield _joined(line, widths, indent)
        if below and row[-1]:
            yield from wrapped(row[-1], width, " " * (indent + 2 * GAP))


def _joined(cells: Sequence[str], widths: Sequence[int], indent: int) -> str:
    padded = [cell + " " * (widths[place] - columns_of(cell)) for place, cell in enumerate(cells)]
    return (" " * indent + (" " * GAP).join(padded)).rstrip()
