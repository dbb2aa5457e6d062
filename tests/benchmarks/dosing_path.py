"""Sodium hydroxide into a ten-component waste, 41 points: one batched call beside the reference code.

The reference code has the same constants (written from the graph) and is given its inputs ready made; its time is that
of running them and reading the same outputs.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from carboy.chemistry.equilibrium import Solved, solve
from carboy.chemistry.network import Network
from tests.chemistry.graph_mixtures import MOL_PER_KG, stock
from tests.chemistry.outside_problems import reference

POINTS = 41
WASTE = {
    "Cu+2": 5e-3, "Zn+2": 5e-3, "Ni+2": 5e-3, "Fe+3": 5e-3, "Cd+2": 1e-3, "Pb+2": 1e-3, "Ca+2": 5e-3,
    "SO4-2": 0.02, "NH4+": 5e-3, "NO3-": 0.0,
}  # fmt: skip
LYE = 0.08  # mol of NaOH in all


@dataclass
class DosingPath:
    """The same path for both codes; mol on 1 kg of water."""

    @cached_property
    def waste(self) -> dict[str, float]:
        """Nitrate makes it neutral."""
        species = stock().index.species
        charge = sum(species[token].charge * amount for token, amount in WASTE.items())
        return {**WASTE, "NO3-": charge}

    @cached_property
    def network(self) -> Network:
        """Of the waste and sodium."""
        return stock().networks.network({*WASTE, "Na+"})

    @cached_property
    def totals(self) -> np.ndarray:
        """[41, C]."""
        made = np.zeros((POINTS, len(self.network.components)))
        for token, amount in self.waste.items():
            made[:, self.network.component_index[token]] = amount
        dose = np.linspace(0.0, LYE, POINTS)
        made[:, self.network.component_index["Na+"]] = dose
        made[:, 0] = -dose
        return made

    @cached_property
    def water(self) -> np.ndarray:
        """mol, with that of the lye's hydroxide: NaOH is Na+ + H2O - H+."""
        return MOL_PER_KG + np.linspace(0.0, LYE, POINTS)

    def ours(self, lanes: slice = slice(None)) -> Solved:
        """One call."""
        return solve(self.network, self.totals[lanes], self.water[lanes], retain_gas=True)

    @cached_property
    def separate_inputs(self) -> list[str]:
        """One input a point."""
        code, inputs = reference(), []
        for row, water in zip(self.totals, self.water, strict=True):
            totals = {token: float(n) for token, n in zip(self.network.components, row, strict=True)}
            question = code.question(totals)
            start = "SOLUTION 1\ntemp 25\npH 7\n"
            inputs.append(start + code.reaction(totals, float(water)) + question.phases() + question.output() + "END\n")
        return inputs

    @cached_property
    def incremental_input(self) -> str:
        """The waste, then 40 equal portions of lye, in one input."""
        code = reference()
        question = code.question({**self.waste, "Na+": 1.0})
        first = "SOLUTION 1\ntemp 25\npH 7\n" + code.reaction(self.waste) + question.phases() + question.output()
        lye = code.reaction({"Na+": LYE, "H+": -LYE}, MOL_PER_KG + LYE, number=2, steps=POINTS - 1)
        return (
            first
            + "SAVE solution 1\nSAVE equilibrium_phases 1\nEND\nUSE solution 1\nUSE equilibrium_phases 1\n"
            + "INCREMENTAL_REACTIONS true\n"
            + lye
            + "END\nINCREMENTAL_REACTIONS false\n"
        )

    def separate(self) -> list[list[float]]:
        """The last row of each input's output."""
        code = reference()
        return [code.rows_of(text)[-1] for text in self.separate_inputs]

    def incremental(self) -> list[list[float]]:
        """The rows of the one input's output, without that of the pure water."""
        return reference().rows_of(self.incremental_input)[-POINTS:]
