"""Stated ranges as lanes: every combination of the ends that matters, the nominal case first."""

from __future__ import annotations

from itertools import product

import numpy as np

from carboy.chemistry.mixture import Array

MOST_FULL = 4  # with up to four ranges every corner is a lane
SAMPLED_CORNERS = 12
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
        rows = [[1] * len(keys)]
        if len(keys) <= MOST_FULL:
            rows += [list(corner) for corner in product((0, 2), repeat=len(keys))] if keys else []
        else:
            rows += [[0] * len(keys), [2] * len(keys)]
            for place in range(len(keys)):
                rows += [[1] * place + [end] + [1] * (len(keys) - place - 1) for end in (0, 2)]
            chosen = np.random.default_rng(20261201).integers(0, 2, size=(SAMPLED_CORNERS, len(keys)))
            rows += (2 * chosen).tolist()
        unique = list(dict.fromkeys(tuple(row) for row in rows))
        self.lanes = len(unique)
        self._values = {
            key: np.array([self.variables[key][row[place]] for row in unique]) for place, key in enumerate(keys)
        }

    def value(self, key: str) -> Array:
        """The values of a variable by its key, after :meth:`fix`."""
        assert self._values is not None
        return self._values[key]
