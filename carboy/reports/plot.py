"""A small plot in text: points over a logarithmic axis, in signs that any terminal and any log shows."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from carboy.reports.figures import number

_MARGIN = 10  # columns of the figures at the left


@dataclass(frozen=True)
class Axis:
    """The ends of an axis, in its own figures; ``log``: laid out by powers of ten."""

    low: float
    high: float
    log: bool

    def share(self, value: float) -> float:
        """Where between 0 and 1 a value lies."""
        low, high = (math.log10(end) for end in (self.low, self.high)) if self.log else (self.low, self.high)
        place = math.log10(value) if self.log else value
        return 0.5 if high == low else (place - low) / (high - low)

    def at(self, share: float) -> float:
        """The value at a share of the axis."""
        if not self.log:
            return self.low + share * (self.high - self.low)
        low, high = math.log10(self.low), math.log10(self.high)
        return 10.0 ** (low + share * (high - low))


def plot_lines(
    points: Sequence[tuple[float, float]],
    x: Axis,
    y: Axis,
    *,
    width: int,
    height: int = 11,
    levels: Sequence[float] = (),
    marked: tuple[float, float] | None = None,
    arrow: float | None = None,
) -> Iterator[str]:
    """Lines of the plot of ``points``. ``levels`` are drawn across as dots; ``marked`` is a stretch of the x axis that is drawn double, and
    ``arrow`` a place on it."""
    columns = width - _MARGIN - 2
    grid = [[" "] * columns for _ in range(height)]
    for level in levels:
        share = y.share(level)
        if 0 <= share <= 1:
            grid[height - 1 - round(share * (height - 1))] = ["."] * columns
    last: tuple[int, int] | None = None
    for across, up in points:
        share = x.share(across)
        if not 0 <= share <= 1:
            continue
        column = round(share * (columns - 1))
        row = height - 1 - round(min(max(y.share(up), 0.0), 1.0) * (height - 1))
        if last is not None and column - last[0] <= columns // 4:
            for between in range(last[0] + 1, column):
                slope = (between - last[0]) / (column - last[0])
                grid[round(last[1] + slope * (row - last[1]))][between] = "*"
        grid[row][column] = "*"
        last = column, row
    for place, line in enumerate(grid):
        shown = number(y.at(1 - place / (height - 1)), 2) if place % 5 == 0 else ""
        yield f"{shown:>{_MARGIN}} |{''.join(line)}".rstrip()
    axis = ["-"] * columns
    if marked is not None:
        first, stop = (round(min(max(x.share(end), 0.0), 1.0) * (columns - 1)) for end in marked)
        axis[first : stop + 1] = ["="] * (stop - first + 1)
    if arrow is not None and 0 <= x.share(arrow) <= 1:
        axis[round(x.share(arrow) * (columns - 1))] = "^"
    yield " " * _MARGIN + " +" + "".join(axis)
