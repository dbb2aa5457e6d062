"""Small tables of text: columns as wide as their longest entry, figures to the right, nothing drawn but spaces."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from carboy.reports.style import columns_of, wrapped

GAP = 2


def table(
    rows: Sequence[Sequence[str]], width: int, *, indent: int = 0, right: Sequence[int] = (), flowing: bool = True
) -> Iterator[str]:
    """Lines of a table. Columns in ``right`` are set to the right; the last column is wrapped to ``width`` if ``flowing``."""
    if not rows:
        return
    count = max(len(row) for row in rows)
    filled = [[*row, *[""] * (count - len(row))] for row in rows]
    widths = [max(columns_of(row[place]) for row in filled) for place in range(count)]
    for row in filled:
        line = " " * indent
        for place in range(count - 1):
            blank = " " * (widths[place] - columns_of(row[place]))
            line += (blank + row[place] if place in right else row[place] + blank) + " " * GAP
        last = row[-1]
        room = width - columns_of(line)
        if flowing and columns_of(last) > room >= 20:
            yield from wrapped(last, width, line)
        elif flowing and columns_of(last) > room:
            yield line.rstrip()
            yield from wrapped(last, width, " " * (indent + GAP))
        else:
            blank = " " * (widths[-1] - columns_of(last)) if count - 1 in right else ""
            yield (line + blank + last).rstrip()
