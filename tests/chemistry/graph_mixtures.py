"""Mixtures drawn from the knowledge graph: whatever of its substances dissolves into components of the equilibria."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cache

import numpy as np

from carboy.chemistry.equilibrium import Solved, solve
from carboy.chemistry.network import Network
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.knowledge.index import load_index

MOL_PER_KG = 1.0 / 0.01801528
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
