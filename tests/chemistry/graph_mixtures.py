"""Mixtures drawn from the knowledge graph: whatever of its substances dissolves into components of the equilibria."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cache

import numpy as np

from carboy.chemistry.equilibrium import Solved, solve
from carboy.chemistry.network import Network
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.knowledge.index import load_index
from tests.chemistry.mixtures import faults

MOL_PER_KG = 1.0 / 0.01801528
VAPOUR_ATM = 0.031271  # water at 25 degC
STYLES = ("dilute", "ordinary", "strong", "end point", "with zeros", "crowded")
VESSELS = ("open", "open", "sealed", "retained")


@cache
def stock() -> ChemicalStock:
    """The shipped graph."""
    return ChemicalStock(load_index())


@cache
def soluble() -> tuple[str, ...]:
    """Ids of the substances that give nothing but components and water."""
    look = stock()
    return tuple(
        name
        for name in sorted(look.index.substances)
        if all(look.kind(token) in ("component", "water") for token in look.yield_of(name))
    )


@dataclass
class Draw:
    """One mixture: mol of each substance on ``water_mol`` of water."""

    style: str
    vessel: str
    portions: dict[str, float]
    water_mol: float = MOL_PER_KG
    headspace_L: float = 1.0
    network: Network = field(init=False, repr=False)
    totals: np.ndarray = field(init=False, repr=False)

    def __post_init__(self) -> None:
        amounts = components(self.portions)
        self.water_mol = max(self.water_mol + amounts.pop(WATER, 0.0), 0.0)
        self.network = stock().networks.network(set(amounts) - {PROTON})
        self.totals = np.array([amounts.get(token, 0.0) for token in self.network.components])

    def solve(self) -> Solved:
        """By itself."""
        return solve(self.network, self.totals[None, :], np.array([self.water_mol]), **self.options())

    def options(self) -> dict[str, object]:
        """Those of :func:`solve` for this vessel."""
        if self.vessel == "sealed":
            return {"headspace_L": np.array([self.headspace_L])}
        return {"retain_gas": self.vessel == "retained"}

    def wrong(self, answer: Solved) -> list[str]:
        """What is wrong with the answer to this mixture; nothing where all is well."""
        if not answer.converged.all():
            return list(answer.reasons)
        available = 1.0 - VAPOUR_ATM if self.vessel == "open" else None
        return faults(answer, self.totals[None, :], np.array([self.water_mol]), available_atm=available)

    def solve_in_order(self, order: np.ndarray) -> Solved:
        """With the components after H+, and with them all species, solids and gases, in another order."""
        net = self.network
        columns = np.concatenate([[0], 1 + order])
        size = len(columns)
        rows = np.concatenate([columns, np.arange(size, len(net.species))[::-1]])
        turned = replace(
            net,
            components=tuple(net.components[c] for c in columns),
            species=tuple(net.species[r] for r in rows),
            nu=net.nu[np.ix_(rows, columns)],
            nu_water=net.nu_water[rows],
            log_beta=net.log_beta[rows],
            charge=net.charge[rows],
            acid_interaction=net.acid_interaction[rows],
            solids=net.solids[::-1],
            solid_nu=net.solid_nu[::-1][:, columns],
            solid_nu_water=net.solid_nu_water[::-1],
            solid_log_beta=net.solid_log_beta[::-1],
            gases=net.gases[::-1],
            gas_nu=net.gas_nu[::-1][:, columns],
            gas_nu_water=net.gas_nu_water[::-1],
            gas_log_beta=net.gas_log_beta[::-1],
        )
        return solve(turned, self.totals[None, columns], np.array([self.water_mol]), **self.options())


def difference(one: Solved, other: Solved) -> str:
    """Where two answers to one question part, whatever the order of their components; nothing where they agree."""
    if abs(one.pH[0] - other.pH[0]) > 1e-6:
        return f"pH {one.pH[0]} and {other.pH[0]}"
    for kind, amounts in (("species", "amounts"), ("solids", "solids"), ("gases", "gas")):
        first = dict(zip(getattr(one.network, kind), getattr(one, amounts)[0], strict=True))
        second = dict(zip(getattr(other.network, kind), getattr(other, amounts)[0], strict=True))
        most = max([*first.values(), 1e-300])
        for name, amount in first.items():
            if abs(amount - second[name]) > 1e-5 * amount + 1e-9 * most:
                return f"{name}: {amount} and {second[name]} mol"
    return ""


def components(portions: Mapping[str, float]) -> dict[str, float]:
    """mol of each component, water among them, of substances or, where none has that id, species."""
    amounts: dict[str, float] = {}
    look = stock()
    for name, portion in portions.items():
        made = look.yield_of(name) if name in look.index.substances else look.components_of(name)
        for token, count in made.items():
            amounts[token] = amounts.get(token, 0.0) + portion * count
    return amounts


def draw(seed: int, number: int) -> Draw:
    """The mixture of a number; the same for the same seed."""
    random = np.random.default_rng((seed, number))
    style, vessel = STYLES[number % len(STYLES)], VESSELS[(number // len(STYLES)) % len(VESSELS)]
    most = 8
    count = most if style == "crowded" else int(random.integers(1, most + 1))
    names = [str(name) for name in random.choice(soluble(), size=count, replace=False)]
    if style == "end point":
        # Whole multiples of one amount: acids just neutralised, metals just precipitated, ligands just used up.
        names = list(dict.fromkeys([*names[:5], *random.choice(_REAGENTS, size=2)]))
        amounts = 10.0 ** random.uniform(-5.0, -0.3) * random.integers(1, 5, size=len(names))
    else:
        low, high = {"dilute": (-9.0, -3.0), "strong": (-1.0, 0.6)}.get(style, (-6.0, 0.0))
        amounts = 10.0 ** random.uniform(low, high, size=len(names))
    if style == "with zeros":
        amounts[random.random(len(names)) < 0.4] = 0.0
        amounts[random.random(len(names)) < 0.1] = 1e-30
    portions = {name: float(amount) for name, amount in zip(names, amounts, strict=True)}
    return Draw(style, vessel, portions, headspace_L=float(10.0 ** random.uniform(-2.0, 1.0)))


_REAGENTS = ("sodium-hydroxide", "hydrochloric-acid", "sodium-sulfide", "sodium-carbonate", "sulfuric-acid", "ammonia")
