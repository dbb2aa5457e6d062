"""Equilibrium of many vessels that hold different things, in few batches.

A batch costs a fixed time (some twenty turns of small matrices) and a time for each lane that grows with the species of
all components together. So vessels whose components differ a little go into one batch over all of these, where what a
vessel lacks is absent from its lane, and vessels that share little do not.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from carboy.chemistry.equilibrium import Solved, solve
from carboy.chemistry.mass_action import IntArray
from carboy.chemistry.network import FloatArray, NetworkFactory

# Times of one batch, of one lane and of one lane per component, in the first as the unit; measured with
# tests/benchmarks. Only their ratios matter, and those little.
_BATCH, _LANE, _COMPONENT = 1.0, 0.004, 0.006
_IMPLIED = ("H+", "H2O")


@dataclass(eq=False)
class SolvedMany:
    """The outcome of :func:`solve_many` for N vessels: some batches, and where each vessel is in them."""

    batches: list[Solved]
    batch: IntArray  # [N]
    lane: IntArray  # [N]

    def one(self, vessel: int) -> Solved:
        """A vessel by itself, one lane."""
        return self.batches[self.batch[vessel]].take(np.array([self.lane[vessel]]))

    def gather(self, name: str) -> FloatArray:
        """An attribute of :class:`Solved` that has one value a lane (``pH``, ``converged``, ...), [N]."""
        parts = [getattr(solved, name) for solved in self.batches]
        whole = np.empty(self.batch.size, dtype=parts[0].dtype if parts else float)
        for number, part in enumerate(parts):
            here = self.batch == number
            whole[here] = part[self.lane[here]]
        return whole


def solve_many(
    networks: NetworkFactory,
    totals: Sequence[Mapping[str, float]],
    water_mol: FloatArray,
    *,
    temperature_C: float = 25.0,
    headspace_L: FloatArray | None = None,
    ambient_atm: float = 1.0,
    retain_gas: bool = False,
) -> SolvedMany:
    """Equilibrium of N vessels given by mol of each component, proton excess under ``H+``; ``water_mol`` [N] is mol.

    The options are those of :func:`carboy.chemistry.equilibrium.solve`, which is called once a batch and whose errors
    are raised here too; ``headspace_L`` is [N] or None.
    """
    count = len(totals)
    water_mol = np.broadcast_to(np.asarray(water_mol, dtype=float), (count,))
    headspace = None if headspace_L is None else np.broadcast_to(np.asarray(headspace_L, dtype=float), (count,))
    sets = [frozenset(token for token, n in vessel.items() if n != 0.0).difference(_IMPLIED) for vessel in totals]
    grouped = _grouped(sets)
    batch, lane = np.zeros(count, dtype=np.intp), np.zeros(count, dtype=np.intp)
    batches: list[Solved] = []
    for components, vessels in grouped:
        network = networks.network(components, temperature_C)
        matrix = np.zeros((len(vessels), len(network.components)))
        for row, vessel in enumerate(vessels):
            for token, amount in totals[vessel].items():
                if amount != 0.0 and token != "H2O":
                    matrix[row, network.component_index[token]] = amount
        places = np.array(vessels, dtype=np.intp)
        batch[places], lane[places] = len(batches), np.arange(places.size)
        batches.append(
            solve(
                network,
                matrix,
                water_mol[places],
                headspace_L=None if headspace is None else headspace[places],
                ambient_atm=ambient_atm,
                retain_gas=retain_gas,
            )
        )
    return SolvedMany(batches, batch, lane)


def _grouped(sets: Sequence[frozenset[str]]) -> list[tuple[frozenset[str], list[int]]]:
    """Vessels to batches: each set of components, the commonest first, where it adds the least time."""
    members: dict[frozenset[str], list[int]] = {}
    for vessel, components in enumerate(sets):
        members.setdefault(components, []).append(vessel)
    groups: list[tuple[frozenset[str], list[int]]] = []
    for components, vessels in sorted(
        members.items(), key=lambda item: (-len(item[0]), -len(item[1]), sorted(item[0]))
    ):
        best, least = -1, _BATCH + _time(len(vessels), len(components))
        for number, (others, inside) in enumerate(groups):
            wide = len(others | components)
            added = _time(len(inside) + len(vessels), wide) - _time(len(inside), len(others))
            if added < least:
                best, least = number, added
        if best < 0:
            groups.append((components, list(vessels)))
        else:
            others, inside = groups[best]
            groups[best] = (others | components, inside + vessels)
    return groups


def _time(lanes: int, components: int) -> float:
    return lanes * (_LANE + _COMPONENT * components)
