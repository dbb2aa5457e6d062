"""Mixtures drawn from the whole graph: dilute to far beyond what dissolves, end points, zero totals, competing solids.

The full run of 5,000 and more is tests/benchmarks/random_mixtures.py.
"""

from __future__ import annotations

import numpy as np

from carboy.chemistry.many import solve_many
from tests.chemistry.graph_mixtures import MOL_PER_KG, difference, draw, stock

SEED, COUNT = 2026, 300


def test_all_converge_and_hold() -> None:
    found = []
    for number in range(COUNT):
        mixture = draw(SEED, number)
        found += [(number, mixture.portions, text) for text in mixture.wrong(mixture.solve())]
    assert found == []


def test_the_order_of_the_totals_does_not_matter() -> None:
    random = np.random.default_rng(SEED)
    found = []
    for number in range(0, COUNT, 4):
        mixture = draw(SEED, number)
        order = random.permutation(len(mixture.network.components) - 1)
        text = difference(mixture.solve(), mixture.solve_in_order(order))
        found += [(number, mixture.portions, text)] * bool(text)
    assert found == []


def test_many_at_once_is_each_by_itself() -> None:
    """Vessels of different content in a few batches; what is absent in one is present in its neighbour's lane."""
    mixtures = [made for made in (draw(SEED, number) for number in range(240)) if made.vessel == "open"][:60]
    totals = [dict(zip(made.network.components, made.totals.tolist(), strict=True)) for made in mixtures]
    many = solve_many(stock().networks, totals, np.array([made.water_mol for made in mixtures]))
    assert len(many.batches) < len(mixtures)
    assert many.gather("converged").all()
    for number, made in enumerate(mixtures):
        alone, among = made.solve(), many.one(number)
        assert abs(alone.pH[0] - among.pH[0]) < 1e-6, made.portions
        assert np.isclose(alone.solids.sum(), among.solids.sum(), rtol=1e-5, atol=1e-9 * made.totals[1:].sum())
        assert np.isclose(alone.gas.sum(), among.gas.sum(), rtol=1e-5, atol=1e-9 * made.totals[1:].sum())


def test_many_of_nothing() -> None:
    assert solve_many(stock().networks, [], np.zeros(0)).gather("pH").size == 0
    water = solve_many(stock().networks, [{}], np.array([MOL_PER_KG]))
    assert abs(water.one(0).pH[0] - 7.0) < 0.01
