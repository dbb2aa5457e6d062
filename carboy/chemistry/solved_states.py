"""States that were solved before: a walk comes back to the same vessel many times, in one lane or in many."""

from __future__ import annotations

from collections import deque

import numpy as np

from carboy.chemistry.equilibrium import Solved, solve
from carboy.chemistry.network import FloatArray, Network

_KEPT = 64  # solutions, each of many lanes


class SolvedStates:
    """:func:`~carboy.chemistry.equilibrium.solve` with a memory of its last solutions, lane by lane.

    A lane is known again by its network and the exact totals, water and headspace that it was solved for.
    """

    def __init__(self) -> None:
        self._place: dict[tuple[int, bytes], tuple[Solved, int]] = {}
        self._kept: deque[tuple[Solved, list[tuple[int, bytes]]]] = deque()

    def solve(
        self,
        network: Network,
        totals: FloatArray,
        water_mol: FloatArray,
        *,
        headspace_L: FloatArray | None,
        start: Solved | None,
    ) -> Solved:
        """As :func:`~carboy.chemistry.equilibrium.solve`, for ``totals`` ``[L, C]`` and the others ``[L]``."""
        columns = [totals, water_mol[:, None]] + ([] if headspace_L is None else [headspace_L[:, None]])
        keys = [(id(network), row.tobytes()) for row in np.concatenate(columns, axis=1)]
        places = [self._place.get(key) for key in keys]
        known = [place for place in places if place is not None]
        if known and len(known) == len(keys):
            return _gathered(known)
        solved = solve(network, totals, water_mol, headspace_L=headspace_L, start=start)
        if solved.converged.all():
            self._keep(solved, keys)
        return solved

    def _keep(self, solved: Solved, keys: list[tuple[int, bytes]]) -> None:
        for lane, key in enumerate(keys):
            self._place[key] = (solved, lane)
        self._kept.append((solved, keys))
        if len(self._kept) > _KEPT:
            old, its = self._kept.popleft()
            for key in its:
                if self._place.get(key, (None,))[0] is old:
                    del self._place[key]


def _gathered(places: list[tuple[Solved, int]]) -> Solved:
    """One solution of the lanes that stand in these places."""
    sources = {id(solved): solved for solved, _ in places}
    begins: dict[int, int] = {}
    whole: Solved | None = None
    for mark, solved in sources.items():
        begins[mark] = 0 if whole is None else whole.converged.size
        whole = solved if whole is None else whole.followed_by(solved)
    assert whole is not None
    return whole.take(np.array([begins[id(solved)] + lane for solved, lane in places], dtype=np.intp))
