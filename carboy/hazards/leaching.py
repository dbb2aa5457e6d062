"""What a leaching test would draw from a cake: the cake in equilibrium with twenty times its weight of each extraction fluid."""

from __future__ import annotations

import numpy as np

from carboy.bench.make_up import Bench
from carboy.bench.ranges import Ranges
from carboy.chemistry.mixture import Mixture, poured_together
from carboy.chemistry.stock import ChemicalStock
from carboy.model.plan import Ingredient, Interval, Portion

_FLUIDS = "extraction-fluid-"  # the materials of the graph that are such fluids begin so
BASIS = (
    "The leaching test is computed: the cake, with the liquid that it holds, in equilibrium with twenty times its weight of each of the two "
    "fluids of EPA method 1311, the worse of which counts. What is insoluble without a known constant is taken to give nothing off. "
    "It is no test: the laboratory's extract decides."
)


def extracts(cake: Mixture, stock: ChemicalStock, inert_g: float = 0.0) -> list[Mixture]:
    """The extract of a cake with each fluid, ``[ranges]``. ``inert_g``: filter aid, paper and the like that are weighed with it."""
    ranges = Ranges()
    ranges.lanes = cake.lanes
    bench = Bench(stock, ranges)
    found = []
    for key, material in stock.index.materials.items():
        if key.startswith(_FLUIDS):
            portion = Portion(
                text=material.name,
                amount=Interval(low=1.0, high=1.0),
                unit="L",
                ingredients=(Ingredient(words=material.name, reference=f"material:{key}"),),
            )
            fluid = bench.make_up(portion, material.name, 25.0).mixture
            ratio = stock.index.thresholds["leaching-liquid-to-solid"].value.magnitude
            share = ratio * (cake.mass_g + inert_g) / np.maximum(fluid.mass_g, 1e-9)
            open_cake = cake.take(np.arange(cake.lanes))
            open_cake.headspace_L = open_cake.air_mol = None
            found.append(poured_together(open_cake, fluid.scaled(share)))
    return found
