"""The same problems with the reference code's own databases: a check of the data, not of the solver.

Redox is decoupled in ours and coupled in theirs, so the problems hold only what neither would oxidise or reduce. Solids
are those that both know as the same thing; aged forms against fresh ones (brucite, Pb(OH)2 of log K 8.15, pyrite) are
left out on both sides.
"""

from __future__ import annotations

import importlib.util
import re
import tempfile
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import phreeqpython
from msgspec import structs

from carboy.chemistry.equilibrium import Solved, solve
from carboy.chemistry.network import NetworkFactory
from carboy.model.knowledge import Equilibrium, Value
from tests.chemistry.database_constants import Make, constants, solids
from tests.chemistry.graph_mixtures import MOL_PER_KG, stock

# Salt -> our components; its formula is what the reference code is given.
SALTS: dict[str, dict[str, float]] = {
    "HCl": {"H+": 1, "Cl-": 1}, "NaOH": {"Na+": 1, "H+": -1, "H2O": 1}, "H2SO4": {"H+": 2, "SO4-2": 1},
    "Na2SO4": {"Na+": 2, "SO4-2": 1}, "NaCl": {"Na+": 1, "Cl-": 1}, "KCl": {"K+": 1, "Cl-": 1},
    "Na2CO3": {"Na+": 2, "CO3-2": 1}, "NaHCO3": {"Na+": 1, "CO3-2": 1, "H+": 1},
    "Na3PO4": {"Na+": 3, "PO4-3": 1}, "NaH2PO4": {"Na+": 1, "PO4-3": 1, "H+": 2}, "NaF": {"Na+": 1, "F-": 1},
    "H3BO3": {"H3BO3": 1}, "CaCl2": {"Ca+2": 1, "Cl-": 2}, "MgCl2": {"Mg+2": 1, "Cl-": 2},
    "BaCl2": {"Ba+2": 1, "Cl-": 2}, "SrCl2": {"Sr+2": 1, "Cl-": 2}, "AlCl3": {"Al+3": 1, "Cl-": 3},
    "FeCl3": {"Fe+3": 1, "Cl-": 3}, "FeCl2": {"Fe+2": 1, "Cl-": 2}, "MnCl2": {"Mn+2": 1, "Cl-": 2},
    "ZnCl2": {"Zn+2": 1, "Cl-": 2}, "CdCl2": {"Cd+2": 1, "Cl-": 2}, "PbCl2": {"Pb+2": 1, "Cl-": 2},
    "CuCl2": {"Cu+2": 1, "Cl-": 2}, "NiCl2": {"Ni+2": 1, "Cl-": 2}, "Ag2SO4": {"Ag+": 2, "SO4-2": 1},
}  # fmt: skip
METALS = {
    "Ca+2": "Ca", "Mg+2": "Mg", "Ba+2": "Ba", "Sr+2": "Sr", "Al+3": "Al", "Fe+3": "Fe", "Fe+2": "Fe", "Mn+2": "Mn",
    "Zn+2": "Zn", "Cd+2": "Cd", "Pb+2": "Pb", "Cu+2": "Cu", "Ni+2": "Ni", "Ag+": "Ag",
}  # fmt: skip
# Our fresh solids -> the names that databases have for the same thing.
SOLIDS: dict[str, tuple[str, ...]] = {
    "calcite": ("Calcite", "CALCITE"), "gypsum": ("Gypsum", "GYPSUM"), "calcium-fluoride": ("Fluorite", "FLUORITE"),
    "calcium-hydroxide": ("Portlandite",), "barium-sulfate": ("Barite",), "barium-carbonate": ("Witherite",),
    "barium-fluoride": ("BaF2",), "strontium-carbonate": ("Strontianite",), "strontium-sulfate": ("Celestite",),
    "strontium-fluoride": ("SrF2",), "aluminium-hydroxide": ("Al(OH)3(a)", "Al(OH)3(am)"),
    "iron-iii-hydroxide": ("Fe(OH)3(a)",), "iron-ii-phosphate": ("Vivianite",), "manganese-ii-hydroxide": ("Pyrochroite",),
    "zinc-hydroxide": ("Zn(OH)2-a", "Zn(OH)2(am)"), "zinc-carbonate": ("ZnCO3:H2O", "ZnCO3:1H2O"),
    "zinc-phosphate": ("Zn3(PO4)2:4w", "Zn3(PO4)2:4H2O"), "zinc-sulfate-basic": ("Zn4(OH)6SO4",),
    "dizinc-trihydroxide-chloride": ("Zn2(OH)3Cl",), "pentazinc-octahydroxide-dichloride": ("Zn5(OH)8Cl2",),
    "cadmium-hydroxide": ("Cd(OH)2(a)", "Cd(OH)2(am)"), "cadmium-carbonate": ("Otavite",),
    "cadmium-phosphate": ("Cd3(PO4)2",), "cadmium-sulfate-basic": ("Cd4(OH)6SO4",), "cadmium-hydroxide-chloride": ("CdOHCl",),
    "lead-carbonate": ("Cerussite", "Cerrusite"), "lead-sulfate": ("Anglesite",), "lead-hydroxide": ("PbO:0.3H2O", "PbO:0.33H2O"),
    "lead-chloride": ("Cotunnite",), "lead-fluoride": ("PbF2",), "lead-chloride-fluoride": ("Matlockite",),
    "lead-carbonate-basic": ("Hydrocerrusite", "Hydrocerussite"), "lead-hydroxide-chloride": ("Laurionite",),
    "dilead-trihydroxide-chloride": ("Pb2(OH)3Cl",), "lead-phosphate": ("Pb3(PO4)2",), "lead-hydrogenphosphate": ("PbHPO4",),
    "chloropyromorphite": ("Clpyromorphite", "Chloropyromorphite"), "copper-ii-hydroxide": ("Cu(OH)2",),
    "malachite": ("Malachite",), "copper-ii-phosphate": ("Cu3(PO4)2:3H2O",), "nickel-phosphate": ("Ni3(PO4)2",),
    "nickel-sulfate-basic": ("Ni4(OH)6SO4",), "magnesium-carbonate-trihydrate": ("Nesquehonite",),
    "silver-chloride": ("Cerargyrite",), "silver-carbonate": ("Ag2CO3",), "silver-phosphate": ("Ag3PO4",),
    "silver-sulfate": ("Ag2SO4",), "silver-oxide": ("Ag2O",), "manganese-ii-phosphate": ("Mn3(PO4)2",),
}  # fmt: skip
PH_ALLOWED, METAL_ALLOWED = 0.1, 0.3  # pH units, log units
LEAST = 1e-12  # mol
_SHIPPED = ("phreeqc.dat", "vitens.dat", "wateq4f_PWN.dat")
_LARGER = ("wateq4f.dat", "minteq.v4.dat")  # with the package phreeqc, where that is installed


@dataclass
class OwnDatabase:
    """One database of the reference code, and ours cut down to the solids that it has.

    ``davies``: with Davies there as here, so that the comparison is of the constants alone.
    """

    path: Path
    davies: bool = False
    code: Any = field(init=False, repr=False)
    networks: NetworkFactory = field(init=False, repr=False)
    rows: tuple[Equilibrium, ...] = field(init=False, repr=False)
    constants: dict[Make, tuple[str, float]] = field(init=False, repr=False)
    solid_constants: dict[str, tuple[dict[str, float], float]] = field(init=False, repr=False)
    solids: dict[str, str] = field(init=False)
    salts: list[str] = field(init=False)

    def __post_init__(self) -> None:
        # "-gamma 0 0" is read as the limiting law; without it the code takes Davies, as MINTEQ means it.
        text = re.sub(
            r"(?m)^\s*-gamma\s+0(\.0*)?\s+0(\.0*)?\s*$", "", self.path.read_text(encoding="utf-8", errors="replace")
        )
        if self.davies:
            text = re.sub(r"(?m)^\s*-(?:llnl_)?gamma\b.*$", "", text)
        text = re.sub(r"(?m)^(\s*-?log_k)\s*$", r"\1 0.0", text)  # three are blank in the wateq4f shipped
        masters, _, rest = text.partition("SOLUTION_SPECIES")
        names = {line.split()[0] for line in rest.partition("PHASES")[2].splitlines() if line[:1].isalpha()}
        self.solids = {ours: name for ours, theirs in SOLIDS.items() for name in theirs if name in names}
        with tempfile.TemporaryDirectory() as folder:
            (Path(folder) / "own.dat").write_text(text)
            self.code = phreeqpython.PhreeqPython(database="own.dat", database_directory=Path(folder))
        index = stock().index
        self.rows = tuple(row for row in index.equilibria if row.kind == "aqueous" or row.product in self.solids)
        self.networks = NetworkFactory(self.rows, index.species)
        self.constants, self.solid_constants = constants(text), solids(text)
        elements = set(re.findall(r"(?m)^\s*([A-Z][a-z]?)\s+\S+\s+\S+\s+\S+", masters)) | {"H", "O"}
        self.salts = [salt for salt in SALTS if set(re.findall(r"[A-Z][a-z]?", salt)) <= elements]

    def compare(self, portions: Mapping[str, float]) -> Compared:
        """Both on the same salts (mol) in 1 kg of water."""
        amounts = _components(portions)
        answer = self.ours(portions, self.networks)
        network = answer.network
        metals = {token: METALS[token] for token in amounts if token in METALS}
        lines = ["DELETE", "-all", "END", "SOLUTION 1", "temp 25", "pH 7", "REACTION 1"]
        lines += [*(f"{salt} {portion!r}" for salt, portion in portions.items()), "1.0 moles in 1 step"]
        if network.solids:
            lines += ["EQUILIBRIUM_PHASES 1", *(f"{self.solids[solid]} 0 0" for solid in network.solids)]
        lines += ["SELECTED_OUTPUT 1", "-reset false", "-high_precision true", "USER_PUNCH 1"]
        wanted = ['-LA("H+")', 'TOT("water")', *(f'TOT("{element}")' for element in metals.values())]
        wanted += [f'EQUI("{self.solids[solid]}")' for solid in network.solids]
        lines.append("-headings " + " ".join(f"c{n}" for n in range(len(wanted))))
        lines += [f"{10 * (n + 1)} PUNCH {what}" for n, what in enumerate(wanted)]
        try:
            self.code.ip.run_string("\n".join([*lines, "END", ""]))
        except Exception as error:
            return Compared(self.path.name, portions, answer, float("nan"), {}, {}, str(error).splitlines()[1][:120])
        values = [float(value) for value in list(self.code.ip.get_selected_output_array())[-1]]
        theirs = {token: value * values[1] for token, value in zip(metals, values[2:], strict=False)}
        formed = dict(zip(network.solids, values[2 + len(metals) :], strict=True))
        return Compared(self.path.name, portions, answer, values[0], theirs, formed)

    def ours(self, portions: Mapping[str, float], networks: NetworkFactory) -> Solved:
        """Our answer with the equilibria of ``networks``."""
        amounts = _components(portions)
        water = MOL_PER_KG + amounts.pop("H2O", 0.0)
        network = networks.network(set(amounts) - {"H+"})
        totals = np.array([[amounts.get(token, 0.0) for token in network.components]])
        return solve(network, totals, np.array([water]), retain_gas=True)

    def constants_that_differ(self, compared: Compared, most: int = 3) -> list[str]:
        """The fewest constants (up to ``most``, found one after the other) that, taken over from theirs, make ours agree.

        Where they do not suffice, a last entry says whether all of them together do, or only the activity model is left.
        """
        present = set(_components(compared.portions)) | {"H+", "H2O"}
        rows = {row.product: row for row in self.rows if set(row.coefficients) <= present}
        species = stock().index.species
        changes: dict[str, Equilibrium | None] = {}
        told: dict[str, str] = {}
        for product, row in rows.items():
            if row.kind == "aqueous":
                found = self.constants.get(frozenset(row.coefficients.items()))
                theirs = None if found is None else found[1]
            else:
                theirs = self.solid_constants.get(self.solids[product], ({}, row.log10_beta))[1]
            if theirs is None:
                changes[product], told[product] = None, f"{product} (log K {row.log10_beta:.2f}) is only in ours"
            elif abs(theirs - row.log10_beta) > 0.03:
                changes[product] = structs.replace(row, log10_beta=theirs)
                told[product] = f"{product}: log K {row.log10_beta:.2f}, there {theirs:.2f}"
        mine = {frozenset(row.coefficients.items()) for row in rows.values() if row.kind == "aqueous"}
        for make, (name, beta) in self.constants.items():
            parts = dict(make)
            if make not in mine and set(parts) <= present:
                new = Equilibrium(f"{name} there", "aqueous", parts, beta, "", Value(beta, "1", self.path.name))
                changes[new.product], told[new.product] = new, f"{name} (log K {beta:.2f}) is only there"
        taken: list[str] = []
        off = compared.off
        for _ in range(most):
            trials = {}
            for product, new in changes.items():
                if product not in taken:
                    trial = dict(rows)
                    trial.pop(product, None)
                    if new is not None:
                        trial[product] = new
                    answer = self.ours(compared.portions, NetworkFactory(tuple(trial.values()), species))
                    trials[product] = replace(compared, answer=answer).off
            if not trials or min(trials.values()) > 0.97 * off:
                break
            best = min(trials, key=lambda product: trials[product])
            off = trials[best]
            taken.append(best)
            chosen = changes[best]
            rows.pop(best, None)
            if chosen is not None:
                rows[best] = chosen
            if off <= 1.0:
                break
        if off <= 1.0:
            return [told[product] for product in taken]
        for product, new in changes.items():
            rows.pop(product, None)
            if new is not None:
                rows[product] = new
        answer = self.ours(compared.portions, NetworkFactory(tuple(rows.values()), species))
        rest = "several together" if replace(compared, answer=answer).off <= 1.0 else "activity coefficients"
        return [*(told[product] for product in taken), rest]


@dataclass
class Compared:
    """One problem: ours less theirs."""

    database: str
    portions: Mapping[str, float]
    answer: Solved
    their_pH: float
    their_metals: dict[str, float]  # mol dissolved
    their_solids: dict[str, float]
    complaint: str = ""

    @property
    def pH_gap(self) -> float:
        """Ours less theirs."""
        return float(self.answer.pH[0]) - self.their_pH

    @property
    def metals(self) -> dict[str, float]:
        """log units of the dissolved, where either has more than LEAST."""
        network, gaps = self.answer.network, {}
        for token, theirs in self.their_metals.items():
            ours = float(self.answer.amounts[0] @ network.nu[:, network.component_index[token]])
            if max(ours, theirs) > LEAST:
                gaps[token] = float(np.log10(max(ours, 1e-30)) - np.log10(max(theirs, 1e-30)))
        return gaps

    @property
    def off(self) -> float:
        """The largest gap in units of what is allowed."""
        gaps = [abs(self.pH_gap) / PH_ALLOWED, *(abs(gap) / METAL_ALLOWED for gap in self.metals.values())]
        return float(max(gaps))

    @property
    def agrees(self) -> bool:
        """Within what is asked."""
        return self.off <= 1.0

    def solids(self) -> dict[str, tuple[float, float]]:
        """Solid -> mol, ours and theirs, where either has some."""
        pairs = zip(self.answer.network.solids, self.answer.solids[0], strict=True)
        both = {name: (float(ours), self.their_solids.get(name, 0.0)) for name, ours in pairs}
        return {name: pair for name, pair in both.items() if max(pair) > 1e-9}


def _components(portions: Mapping[str, float]) -> dict[str, float]:
    amounts: dict[str, float] = {}
    for salt, portion in portions.items():
        for token, count in SALTS[salt].items():
            amounts[token] = amounts.get(token, 0.0) + portion * count
    return amounts


@cache
def databases(*, davies: bool = False) -> tuple[OwnDatabase, ...]:
    """Those shipped with phreeqpython, and the larger ones where the package phreeqc is installed."""
    paths = [Path(phreeqpython.__file__).parent / "database" / name for name in _SHIPPED]
    more = importlib.util.find_spec("phreeqc")
    if more is not None and more.origin is not None:
        paths += [Path(more.origin).parent / "databases" / name for name in _LARGER]
    return tuple(OwnDatabase(path, davies) for path in paths if path.exists())


def own_problems(database: OwnDatabase, seed: int, count: int) -> Iterator[dict[str, float]]:
    """Two to six salts, 0.1 mmol to 50 mmol, where both oxidation states of iron are not in one bottle."""
    made = number = 0
    while made < count:
        random = np.random.default_rng((seed, number))
        number += 1
        salts = [str(s) for s in random.choice(database.salts, size=int(random.integers(2, 7)), replace=False)]
        if {"FeCl2", "FeCl3"} <= set(salts) or ("FeCl2" in salts and {"CuCl2", "Ag2SO4"} & set(salts)):
            continue
        made += 1
        yield {salt: float(10.0 ** random.uniform(-4.0, -1.3)) for salt in salts}
