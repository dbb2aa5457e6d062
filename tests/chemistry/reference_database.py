"""The same problem for an independent code: PHREEQC, through phreeqpython.

The database text is written from our own Equilibrium records, so that both codes have the same constants. Every
component becomes an element of its own; that decouples the oxidation states. No ``-gamma`` is given: without it
PHREEQC uses the Davies equation for ions and 0.1 I for neutral species (``-gamma 0 0`` would mean the limiting law).
Elements are given as a REACTION on pure water, so that total protons and total water are set as in our solver; the
totals must be neutral in charge.
"""

from __future__ import annotations

import tempfile
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from math import ceil
from pathlib import Path
from string import ascii_lowercase
from typing import Any

import phreeqpython

from carboy.model.knowledge import Equilibrium

MOL_PER_KG_WATER = 1.0 / 0.01801528

_HEAD = """SOLUTION_MASTER_SPECIES
H H+ -1. H 1.008
H(0) H2 0. H
H(1) H+ -1. 0.
E e- 0. 0. 0.
O H2O 0. O 16.0
O(0) O2 0. O
O(-2) H2O 0. 0.
"""
_SPECIES = """SOLUTION_SPECIES
H+ = H+
log_k 0.
e- = e-
log_k 0.
H2O = H2O
log_k 0.
2 H+ + 2 e- = H2
log_k -3.15
2 H2O = O2 + 4 H+ + 4 e-
log_k -86.08
"""


@dataclass
class Outcome:
    """What the reference found; mol per run, atm."""

    pH: float
    ionic_strength: float
    water_kg: float
    molalities: dict[str, float]
    solids: dict[str, float]
    gas: dict[str, float]
    dissolved: dict[str, float]


class Reference:
    """PHREEQC with a database written from ``equilibria`` over ``components`` (token to charge)."""

    def __init__(
        self, equilibria: Sequence[Equilibrium], components: Mapping[str, int], *, ideal: bool = False
    ) -> None:
        """``ideal``: all activity coefficients are one, for constants that hold them already."""
        # An ion of endless size has no Debye-Hueckel term.
        self.gamma = "-gamma 1e12 0\n" if ideal else ""
        self.components = {token: charge for token, charge in components.items() if token not in ("H+", "H2O")}
        self.element = {
            token: f"X{ascii_lowercase[number // 26]}{ascii_lowercase[number % 26]}"
            for number, token in enumerate(self.components)
        }
        known = {*self.components, "H+", "H2O"}
        self.rows = [row for row in equilibria if set(row.coefficients) <= known]
        self.hydrogen = dict.fromkeys(self.components, 0)
        self.oxygen = dict.fromkeys(self.components, 0)
        self._give_atoms()
        self.formula = {token: self._formula({token: 1.0}) + _charge(z) for token, z in self.components.items()}
        for row in self.rows:
            if row.kind == "aqueous":
                z = sum(
                    n * (1 if token == "H+" else 0 if token == "H2O" else self.components[token])
                    for token, n in row.coefficients.items()
                )
                self.formula[row.product] = self._formula(row.coefficients) + _charge(round(z))
        self.text = self._database()
        with tempfile.TemporaryDirectory() as folder:
            path = Path(folder) / "reference.dat"
            path.write_text(self.text)
            self.code: Any = phreeqpython.PhreeqPython(database=path.name, database_directory=path.parent)

    def _give_atoms(self) -> None:
        """Give each component the H and O that leave no product with a negative number of either."""
        for atoms, per_proton, per_water in ((self.oxygen, 0, 1), (self.hydrogen, 1, 2)):
            for _ in range(50):
                settled = True
                for row in self.rows:
                    held = {token: n for token, n in row.coefficients.items() if token in self.components}
                    count = sum(n * atoms[token] for token, n in held.items())
                    count += per_proton * row.coefficients.get("H+", 0.0) + per_water * row.coefficients.get("H2O", 0.0)
                    if count < -1e-9:
                        token = max(held, key=lambda one: held[one])
                        atoms[token] += ceil(-count / held[token])
                        settled = False
                if settled:
                    break

    def _formula(self, coefficients: Mapping[str, float]) -> str:
        hydrogen, oxygen = coefficients.get("H+", 0.0), coefficients.get("H2O", 0.0)
        hydrogen += 2.0 * oxygen
        text = ""
        for token, n in coefficients.items():
            if token in self.components:
                text += f"{self.element[token]}{n:g}"
                hydrogen += n * self.hydrogen[token]
                oxygen += n * self.oxygen[token]
        return text + (f"H{hydrogen:g}" if hydrogen else "") + (f"O{oxygen:g}" if oxygen else "")

    def _side(self, coefficients: Mapping[str, float], sign: float) -> list[str]:
        names = {"H+": "H+", "H2O": "H2O"}
        return [f"{sign * n:g} {names.get(t) or self.formula[t]}" for t, n in coefficients.items() if sign * n > 0]

    def _database(self) -> str:
        masters, phases = _HEAD, "PHASES\n"
        species = _SPECIES.replace("H+ = H+\nlog_k 0.\n", "H+ = H+\nlog_k 0.\n" + self.gamma)
        first = next(iter(self.components))
        for token in self.components:
            masters += f"{self.element[token]} {self.formula[token]} 0. {self.element[token]} 10.0\n"
            species += f"{self.formula[token]} = {self.formula[token]}\nlog_k 0.\n" + self.gamma
        masters += f"Alkalinity {self.formula[first]} 1. {self.element[first]} 10.0\n"
        for number, row in enumerate(self.rows):
            given, made = self._side(row.coefficients, 1.0), self._side(row.coefficients, -1.0)
            if row.kind == "aqueous":
                species += f"{' + '.join(given)} = {' + '.join([self.formula[row.product], *made])}\n"
                species += f"log_k {row.log10_beta!r}\n" + self.gamma
            else:
                name = f"Ph{number}" + ("(g)" if row.kind == "gas" else "")
                phases += f"{name}\n{' + '.join([self._formula(row.coefficients), *made])} = {' + '.join(given)}\n"
                phases += f"log_k {-row.log10_beta!r}\n"
        return masters + species + phases + "END\n"

    def run(
        self,
        totals: Mapping[str, float],
        *,
        gas: str = "",
        water_mol: float = MOL_PER_KG_WATER,
        temperature_C: float = 25.0,
    ) -> Outcome:
        """Equilibrium of ``totals`` (mol, neutral together) with all solids; ``gas`` is a GAS_PHASE block's options
        or nothing.
        """
        question = self.question(totals)
        knobs = "KNOBS\n-iterations 600\n-convergence_tolerance 1e-12\n"
        start = f"SOLUTION 1\ntemp {temperature_C}\npH 7\n"
        text = start + knobs + self.reaction(totals, water_mol) + question.phases(gas) + question.output() + "END\n"
        return question.outcome(self.rows_of(text)[-1])

    def rows_of(self, text: str) -> list[list[float]]:
        """Run an input on an empty state; the rows of its selected output."""
        self.code.ip.run_string("DELETE\n-all\nEND\n" + text)
        return [list(row) for row in self.code.ip.get_selected_output_array()[1:]]

    def reaction(
        self, totals: Mapping[str, float], water_mol: float = MOL_PER_KG_WATER, number: int = 1, steps: int = 1
    ) -> str:
        """A REACTION that makes ``totals`` of the first kilogram of water, or adds them where ``water_mol`` is one
        kilogram.
        """
        lines = [f"REACTION {number}"]
        hydrogen = totals.get("H+", 0.0) + 2.0 * (water_mol - MOL_PER_KG_WATER)
        oxygen = water_mol - MOL_PER_KG_WATER
        for token, amount in totals.items():
            if token in self.components and amount:
                lines.append(f"{self.element[token]} {amount!r}")
                hydrogen += amount * self.hydrogen[token]
                oxygen += amount * self.oxygen[token]
        lines += [f"H {hydrogen!r}", f"O {oxygen!r}", f"1.0 moles in {steps} steps", ""]
        return "\n".join(lines)

    def question(self, totals: Mapping[str, float]) -> Question:
        """What to ask for where ``totals`` are the components."""
        present = {token for token, amount in totals.items() if amount} | {"H+", "H2O"}
        here = [(n, row) for n, row in enumerate(self.rows) if set(row.coefficients) <= present]
        aqueous = [token for token, z in self.components.items() if token in present]
        aqueous += [row.product for _, row in here if row.kind == "aqueous"]
        return Question(
            aqueous={token: self.formula[token] for token in aqueous},
            solids={row.product: f"Ph{n}" for n, row in here if row.kind == "solid"},
            gases={row.product: f"Ph{n}(g)" for n, row in here if row.kind == "gas"},
            elements={token: self.element[token] for token in totals if token in self.components},
        )


@dataclass
class Question:
    """The names under which the reference knows what may form; ours to theirs."""

    aqueous: dict[str, str]
    solids: dict[str, str]
    gases: dict[str, str]
    elements: dict[str, str]

    def phases(self, gas: str = "") -> str:
        """The blocks that let them form."""
        lines: list[str] = []
        if self.solids:
            lines += ["EQUILIBRIUM_PHASES 1", *(f"{name} 0 0" for name in self.solids.values())]
        if gas:
            lines += ["GAS_PHASE 1", gas, *(f"{name} 0" for name in self.gases.values())]
        return "\n".join([*lines, ""])

    def output(self) -> str:
        """The blocks that print them."""
        wanted = ['-LA("H+")', "MU", 'TOT("water")']
        wanted += [f'MOL("{formula}")' for formula in self.aqueous.values()]
        wanted += [f'EQUI("{name}")' for name in self.solids.values()]
        wanted += [f'GAS("{name}")' for name in self.gases.values()]
        wanted += [f'TOT("{name}")' for name in self.elements.values()]
        lines = ["SELECTED_OUTPUT 1", "-reset false", "-high_precision true", "USER_PUNCH 1"]
        lines.append("-headings " + " ".join(f"c{n}" for n in range(len(wanted))))
        lines += [f"{10 * (n + 1)} PUNCH {what}" for n, what in enumerate(wanted)]
        return "\n".join([*lines, ""])

    def outcome(self, row: Sequence[float]) -> Outcome:
        """One row of that output."""
        values = [float(value) for value in row]
        cut = 3
        parts: list[dict[str, float]] = []
        for group in (self.aqueous, self.solids, self.gases, self.elements):
            parts.append(dict(zip(group, values[cut : cut + len(group)], strict=True)))
            cut += len(group)
        dissolved = {token: value * values[2] for token, value in parts[3].items()}
        return Outcome(values[0], values[1], values[2], parts[0], parts[1], parts[2], dissolved)


def _charge(value: int) -> str:
    if value == 0:
        return ""
    sign = "+" if value > 0 else "-"
    return sign if abs(value) == 1 else f"{sign}{abs(value)}"
