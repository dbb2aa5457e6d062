"""Problems over the whole graph for the reference code, and the comparison of both answers.

Both have the same constants and below I = 0.39 mol/kg the same activity model, so that what differs is the solver.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache

import numpy as np
from msgspec import structs

from carboy.chemistry.activity import DAVIES_HELD_FROM
from carboy.chemistry.equilibrium import Solved
from tests.chemistry.graph_mixtures import VAPOUR_ATM, Draw, soluble, stock
from tests.chemistry.mixtures import neutral
from tests.chemistry.reference_database import Outcome, Reference
from tests.chemistry.test_equilibrium_reference import PROBLEMS

LEAST = 1e-12  # mol; dissolved totals below it are not compared
PH_ALLOWED, DISSOLVED_ALLOWED = 0.02, 0.01  # pH units; relative
_STRONGEST = 0.9 * DAVIES_HELD_FROM
_ADJUST = ("hydrochloric-acid", "nitric-acid", "sodium-hydroxide", "sodium-carbonate", "sodium-sulfide", "ammonia")


@cache
def reference() -> Reference:
    """PHREEQC with the constants of the graph, slow solids left out as in the networks."""
    index = stock().index
    rows = [
        row
        for row in index.equilibria
        if not (row.kind == "solid" and row.product in index.species and index.species[row.product].forms == "slow")
        and not (row.kind == "gas" and set(row.coefficients) <= {"H2O"})
    ]
    tokens = {token for row in rows for token in row.coefficients}
    tokens |= {token for name in soluble() for token in stock().yield_of(name)}  # ions that form nothing carry charge
    return Reference(rows, {token: index.species[token].charge for token in sorted(tokens - {"H+", "H2O"})})


@dataclass
class Compared:
    """One problem: ours against theirs."""

    name: str
    draw: Draw
    answer: Solved
    outcome: Outcome | None  # None where the reference code gave up
    complaint: str = ""

    @property
    def pH_gap(self) -> float:
        """Ours less theirs."""
        return float("nan") if self.outcome is None else float(self.answer.pH[0]) - self.outcome.pH

    def dissolved(self) -> dict[str, tuple[float, float]]:
        """Component -> mol dissolved, ours and theirs, where either is above LEAST."""
        if self.outcome is None:
            return {}
        network, pairs = self.answer.network, {}
        for token, theirs in self.outcome.dissolved.items():
            ours = float(self.answer.amounts[0] @ network.nu[:, network.component_index[token]])
            if max(ours, theirs) > LEAST:
                pairs[token] = (ours, theirs)
        return pairs

    @property
    def worst(self) -> tuple[str, float]:
        """The component whose dissolved total differs most, and by what share."""
        gaps = {t: abs(ours - theirs) / max(ours, theirs) for t, (ours, theirs) in self.dissolved().items()}
        return max(gaps.items(), key=lambda item: item[1], default=("", 0.0))

    @property
    def agrees(self) -> bool:
        """Within what is asked."""
        return (
            bool(self.answer.converged[0])
            and self.outcome is not None
            and abs(self.pH_gap) <= PH_ALLOWED
            and self.worst[1] <= DISSOLVED_ALLOWED
        )


def compare(name: str, draw: Draw, code: Reference | None = None) -> Compared:
    """Both codes on one problem; ``code`` None is :func:`reference`."""
    answer = draw.solve()
    totals = dict(zip(draw.network.components, draw.totals, strict=True))
    gas = ""
    if draw.network.gases and draw.vessel == "open":
        gas = f"-fixed_pressure\n-pressure {1.0 - VAPOUR_ATM!r}\n-volume 1e-3\n-temperature 25"
    elif draw.network.gases and draw.vessel == "sealed":
        gas = f"-fixed_volume\n-volume {draw.headspace_L!r}\n-temperature 25"
    try:
        outcome = (code or reference()).run(
            {token: float(n) for token, n in totals.items()}, gas=gas, water_mol=draw.water_mol
        )
    except Exception as error:
        return Compared(name, draw, answer, None, str(error).strip().splitlines()[0][:200])
    return Compared(name, draw, answer, outcome)


def compare_strong(name: str, draw: Draw) -> Compared:
    """Both codes beyond Davies: our activity coefficients, at the ionic strength that we found, go into the constants of
    the reference code, which then has none of its own. Its pH is of the molality, and is brought to ours.
    """
    answer = draw.solve()
    network = answer.network
    size = len(network.components)
    strength = float(answer.ionic_strength[0])
    held = min(strength, DAVIES_HELD_FROM)
    ion = -0.509 * (np.sqrt(held) / (1.0 + np.sqrt(held)) - 0.3 * held)
    log_g = np.where(network.charge == 0.0, 0.1 * min(strength, 5.0), ion * network.charge**2)
    molality = answer.amounts[0] / answer.water_kg[0]
    part = (1.0 - held / strength) * np.clip((molality[0] - 0.1) / 0.4, 0.0, 1.0)  # strong acid
    log_g[0] += part * (np.minimum(molality, 20.0) @ network.acid_interaction)
    log_g += part * min(molality[0], 20.0) * network.acid_interaction
    shift = dict(zip(network.species[size:], network.nu[size:] @ log_g[:size] - log_g[size:], strict=True))
    shift |= dict(zip(network.solids, network.solid_nu @ log_g[:size], strict=True))
    shift |= dict(zip(network.gases, network.gas_nu @ log_g[:size], strict=True))
    rows = [
        structs.replace(row, log10_beta=row.log10_beta + float(shift[row.product]))
        for row in stock().index.equilibria
        if row.product in shift
    ]
    species = stock().index.species
    code = Reference(rows, {token: species[token].charge for token in network.components[1:]}, ideal=True)
    compared = compare(name, draw, code)
    if compared.outcome is not None:
        compared.outcome.pH -= float(log_g[0])
    return compared


def strong_problems(seed: int, count: int) -> Iterator[tuple[str, Draw]]:
    """Two to five substances of the graph, 0.1 to 2.5 mol, from where the models part up to I = 8 mol/kg."""
    made = number = 0
    while made < count:
        random = np.random.default_rng((seed, number))
        number += 1
        names = [str(name) for name in random.choice(soluble(), size=int(random.integers(1, 4)), replace=False)]
        names += [str(name) for name in random.choice(_ADJUST, size=int(random.integers(1, 3)), replace=False)]
        portions = {name: float(10.0 ** random.uniform(-1.0, 0.4)) for name in names}
        drawn = Draw("strong", ("open", "sealed", "retained")[number % 3], portions, headspace_L=1.0)
        answer = drawn.solve()
        wet = answer.water_kg[0] > 0.5 and answer.amounts[0].sum() / answer.water_kg[0] < 15.0
        if DAVIES_HELD_FROM < answer.ionic_strength[0] < 8.0 and wet:
            made += 1
            yield f"strong {number - 1}", drawn


def random_problems(seed: int, count: int) -> Iterator[tuple[str, Draw]]:
    """Up to seven substances of the graph in 1 kg of water, below the strength where the models part."""
    made = number = 0
    while made < count:
        random = np.random.default_rng((seed, number))
        number += 1
        names = [str(name) for name in random.choice(soluble(), size=int(random.integers(1, 6)), replace=False)]
        names += [str(name) for name in random.choice(_ADJUST, size=int(random.integers(0, 3)), replace=False)]
        portions = {name: float(10.0 ** random.uniform(-5.0, -1.2)) for name in names}
        vessel = ("open", "sealed", "retained")[number % 3]
        drawn = Draw("random", vessel, portions, headspace_L=float(10.0 ** random.uniform(-1.5, 0.5)))
        if drawn.solve().ionic_strength[0] < _STRONGEST:
            made += 1
            yield f"random {number - 1}", drawn


# Substances (or component tokens) in mol on 1 kg of water; every one turns on something: a solid against a complex, an
# end point, solids that compete, a gas, a constant far from the others.
_MORE: dict[str, dict[str, float]] = {
    "spent fixer: silver thiosulfate and sulfide": {
        "silver-nitrate": 0.01, "sodium-thiosulfate": 0.05, "sodium-sulfide": 0.006, "acetic-acid": 0.02,
    },
    "silver thiosulfate alone": {"silver-nitrate": 0.01, "sodium-thiosulfate": 0.08},
    "silver bromide in ammonia": {"silver-nitrate": 0.005, "sodium-bromide": 0.005, "ammonia": 0.3},
    "silver iodide in cyanide": {"silver-nitrate": 0.005, "potassium-iodide": 0.005, "potassium-cyanide": 0.02},
    "silver chloride, bromide, iodide compete": {
        "silver-nitrate": 0.01, "sodium-chloride": 0.01, "sodium-bromide": 0.004, "potassium-iodide": 0.004,
    },
    "mercury iodide and a little iodide": {"mercury-ii-nitrate": 0.005, "potassium-iodide": 0.01},
    "mercury iodide dissolved in iodide": {"mercury-ii-nitrate": 0.005, "potassium-iodide": 0.05},
    "mercury chloride and lye": {"mercury-ii-chloride": 0.01, "sodium-hydroxide": 0.03},
    "mercury, thiocyanate": {"mercury-ii-nitrate": 0.005, "potassium-thiocyanate": 0.03},
    "mercury sulfide in alkaline sulfide": {
        "mercury-ii-nitrate": 0.002, "sodium-sulfide": 0.05, "sodium-hydroxide": 0.1,
    },
    "calomel": {"Hg2+2": 0.005, "NO3-": 0.01, "sodium-chloride": 0.02},
    "copper(I) chloride in hydrochloric acid": {"copper-i-chloride": 0.01, "hydrochloric-acid": 0.2},
    "copper and citrate in lye": {
        "copper-ii-sulfate-pentahydrate": 0.01, "trisodium-citrate-dihydrate": 0.02, "sodium-hydroxide": 0.03,
    },
    "copper and ethylenediamine": {"copper-ii-sulfate-pentahydrate": 0.01, "ethylenediamine": 0.04},
    "copper, oxalate": {"copper-ii-sulfate-pentahydrate": 0.01, "sodium-oxalate": 0.015},
    "nickel and cyanide": {"nickel-ii-sulfate-hexahydrate": 0.005, "sodium-cyanide": 0.025},
    "nickel, EDTA and lye": {"nickel-ii-sulfate-hexahydrate": 0.01, "Edta-4": 0.01, "Na+": 0.04, "sodium-hydroxide": 0.03},
    "nickel and sulfide": {"nickel-ii-sulfate-hexahydrate": 0.01, "sodium-sulfide": 0.012},
    "zinc cyanide bath": {"zinc-oxide": 0.01, "sodium-cyanide": 0.06, "sodium-hydroxide": 0.05},
    "zinc and ammonia": {"zinc-chloride": 0.01, "ammonia": 0.2},
    "zinc and phosphate": {"zinc-chloride": 0.01, "trisodium-phosphate-dodecahydrate": 0.008},
    "cadmium and sulfide": {"cadmium-chloride": 0.005, "sodium-sulfide": 0.005},
    "lead and chromate": {"lead-ii-nitrate": 0.01, "potassium-chromate": 0.012},
    "lead, chromate and sulfate compete": {
        "lead-ii-nitrate": 0.02, "potassium-chromate": 0.01, "sodium-sulfate": 0.02,
    },
    "lead iodide": {"lead-ii-nitrate": 0.01, "potassium-iodide": 0.03},
    "lead and EDTA and sulfide": {"lead-ii-nitrate": 0.005, "Edta-4": 0.006, "Na+": 0.024, "sodium-sulfide": 0.005},
    "barium: sulfate, chromate, carbonate": {
        "barium-chloride-dihydrate": 0.02, "sodium-sulfate": 0.008, "potassium-chromate": 0.008, "sodium-carbonate": 0.008,
    },
    "chromium(III) and lye to the end point": {"chromium-iii-chloride-hexahydrate": 0.01, "sodium-hydroxide": 0.03},
    "chromium(III) and much lye": {"chromium-iii-chloride-hexahydrate": 0.01, "sodium-hydroxide": 0.2},
    "iron(III), fluoride": {"iron-iii-chloride-hexahydrate": 0.01, "sodium-fluoride": 0.06, "hydrochloric-acid": 0.02},
    "fluoride and lime": {"sodium-fluoride": 0.1, "calcium-hydroxide": 0.06},
    "hydrofluoric acid and calcium chloride": {"hydrofluoric-acid": 0.1, "calcium-chloride-dihydrate": 0.05},
    "arsenic(V) and iron": {"Na+": 0.005, "H3AsO4": 0.005, "H+": -0.005, "iron-iii-chloride-hexahydrate": 0.01},
    "phosphate, magnesium, ammonium": {
        "disodium-hydrogenphosphate": 0.01, "magnesium-chloride-hexahydrate": 0.01, "ammonia": 0.02,
    },
    "calcium, carbonate, phosphate": {
        "calcium-chloride-dihydrate": 0.03, "sodium-carbonate": 0.01, "disodium-hydrogenphosphate": 0.01,
    },
    "azide made acid": {"sodium-azide": 0.05, "hydrochloric-acid": 0.06},
    "nitrite made acid": {"sodium-nitrite": 0.05, "hydrochloric-acid": 0.04},
    "sulfite made acid": {"sodium-sulfite": 0.1, "hydrochloric-acid": 0.2},
    "hypochlorite and chloride made acid": {"sodium-hypochlorite": 0.05, "sodium-chloride": 0.05, "hydrochloric-acid": 0.08},
    "ammonium and lye": {"ammonium-chloride": 0.2, "sodium-hydroxide": 0.2},
    "uranyl and carbonate": {"uranyl-nitrate-hexahydrate": 0.002, "sodium-carbonate": 0.02},
    "tin(II) chloride in water": {"Sn+2": 0.01, "Cl-": 0.02},
    "silicate made acid": {"sodium-metasilicate": 0.02, "hydrochloric-acid": 0.04},
    "aluminate to its end point": {"aluminium-chloride-hexahydrate": 0.01, "sodium-hydroxide": 0.04},
}  # fmt: skip


def chosen_problems() -> Iterator[tuple[str, Draw]]:
    """Open vessels, and sealed ones where there is a gas to speak of."""
    for name, mixture in PROBLEMS.items():
        yield name, Draw("chosen", "open", neutral(mixture))
    for name, portions in _MORE.items():
        yield name, Draw("chosen", "open", dict(portions))
    for name in ("azide made acid", "sulfite made acid", "ammonium and lye", "hypochlorite and chloride made acid"):
        yield f"{name}, sealed", Draw("chosen", "sealed", dict(_MORE[name]), headspace_L=0.8)
