"""Stated ranges as lanes: the combinations of their ends and of points between them, the nominal case first."""

from __future__ import annotations

from itertools import product

import numpy as np

from carboy.chemistry.mixture import Array

MOST_FULL = 4  # with up to four ranges every corner is a lane, and points between the ends as well
_STEPS = 40  # a range runs from 0 to 40, the nominal value lies at 20
_MIDDLE = 20
_GRID = {1: 21, 2: 5, 3: 3, 4: 2}  # points along each range: a worst case may lie between the ends
_ALONE = (0, 10, 30, 40)  # with many ranges, where each is tried with the others nominal
SAMPLED_CORNERS = 12
WIDE = 4.0  # ends further apart than this have the points between them in equal ratios
DECADES = (
    1000.0  # and these reach down to so small a part of the upper end; below it only the lower end itself is looked at
)
OPEN_END_FACTOR = 10.0  # "at least x" is followed up to ten times x


class Ranges:
    """Collects the uncertain numbers of a plan in a first reading, then hands each out as one value a lane.

    Reading a plan twice with the same object, :meth:`fix` between, gives arrays of shape ``[lanes]``. Lane 0 is nominal.
    """

    def __init__(self) -> None:
        self.variables: dict[str, tuple[float, float, float]] = {}
        self._values: dict[str, Array] | None = None
        self.lanes = 1

    @property
    def fixed(self) -> bool:
        """Whether the lanes are laid out."""
        return self._values is not None

    def draw(self, key: str, low: float, high: float, nominal: float | None = None) -> Array:
        """The value of one uncertain number in every lane. ``key`` says in plain words whose number it is."""
        if not np.isfinite(high):
            high = max(low, 1e-12) * OPEN_END_FACTOR
        if low == high:
            return np.full(self.lanes, low)
        middle = 0.5 * (low + high) if nominal is None else min(max(nominal, low), high)
        if self._values is None:
            self.variables[key] = (low, middle, high)
            return np.full(self.lanes, middle)
        return self._values[key]

    def fix(self) -> None:
        """End of the first reading: lay out the lanes."""
        keys = list(self.variables)
        count = len(keys)
        rows: list[tuple[int, ...]] = [(_MIDDLE,) * count]
        if 0 < count <= MOST_FULL:
            levels = np.linspace(0, _STEPS, _GRID[count], dtype=int)
            rows += [tuple(int(level) for level in row) for row in product(levels, repeat=count)]
        elif count:
            rows += [(0,) * count, (_STEPS,) * count]
            for place in range(count):
                rows += [(_MIDDLE,) * place + (end,) + (_MIDDLE,) * (count - place - 1) for end in _ALONE]
            chosen = np.random.default_rng(20261201).integers(0, 2, size=(SAMPLED_CORNERS, count))
            rows += [tuple(int(_STEPS * end) for end in row) for row in chosen]
        unique = list(dict.fromkeys(tuple(row) for row in rows))
        self.lanes = len(unique)
        self._values = {
            key: np.array([_at(self.variables[key], row[place] / _STEPS) for row in unique])
            for place, key in enumerate(keys)
        }

    def value(self, key: str) -> Array:
        """The values of a variable by its key, after :meth:`fix`."""
        assert self._values is not None
        return self._values[key]

    def leverage(self, key: str, levels: Array) -> float:
        """How much a variable moves a severity: the spread of the mean of ``levels`` ``[lanes]`` over the variable's values."""
        values = self.value(key)
        means = [float(levels[values == value].mean()) for value in np.unique(values)]
        return max(means) - min(means)


def _at(variable: tuple[float, float, float], share: float) -> float:
    """A value along low, nominal, high, of which the nominal one lies at half."""
    low, nominal, high = variable
    return _between(low, nominal, 2 * share) if share <= 0.5 else _between(nominal, high, 2 * share - 1)


def _between(first: float, last: float, share: float) -> float:
    """A value between two: in equal steps, or in equal ratios where they lie far apart, so that no decade goes without a point."""
    if share in (0.0, 1.0):
        return last if share else first
    if first > 0 and last > WIDE * first:
        near = max(first, last / DECADES)
        return float(near * (last / near) ** share)
    return first + (last - first) * share
