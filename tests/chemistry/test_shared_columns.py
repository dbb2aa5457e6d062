"""Components that never meet take turns in one column, and nothing of the answer depends on it."""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry import equilibrium
from carboy.chemistry.columns import shared_columns
from carboy.vetting import laboratory

PAIRS = (
    ("CO3-2", "Ca+2"), ("S-2", "Hg+2"), ("PO4-3", "Mg+2"), ("CN-", "Ag+"), ("F-", "Al+3"), ("SO4-2", "Ba+2"), ("NH3", "Cu+2"),
)  # fmt: skip


def test_those_that_meet_never_share() -> None:
    rng = np.random.default_rng(5)
    present = rng.random((200, 30)) < 0.1
    present[:, 0] = True
    column = shared_columns(present)
    assert column[0] == 0
    assert np.count_nonzero(column == 0) == 1
    for lane in present:
        used = column[lane]
        assert len(set(used)) == len(used)
    fullest = int(present.sum(axis=1).max())
    assert fullest <= column.max() + 1 < 30  # fewer than the components


def test_a_batch_of_strangers_is_solved_as_each_by_itself(monkeypatch: pytest.MonkeyPatch) -> None:
    stock = laboratory().stock
    tokens = tuple(dict.fromkeys(token for pair in PAIRS for token in pair if stock.kind(token) == "component"))
    network = stock.networks.network(tokens)
    totals = np.zeros((len(PAIRS), len(network.components)))
    for lane, pair in enumerate(PAIRS):
        for place, token in enumerate(pair):
            if token in network.components:
                totals[lane, network.components.index(token)] = 0.01 * (lane + 1 + place)
        totals[lane, 0] = 0.002 * lane
    water = np.full(len(PAIRS), 55.5)
    assert len(network.components) > 12
    together = equilibrium.solve(network, totals, water)
    monkeypatch.setattr(equilibrium, "_FEW", len(network.components))  # every component a column of its own
    apart = equilibrium.solve(network, totals, water)
    assert together.converged.all()
    assert apart.converged.all()
    assert together.pH == pytest.approx(apart.pH, abs=1e-7)
    assert together.amounts == pytest.approx(apart.amounts, rel=1e-6, abs=1e-15)
    assert together.solids == pytest.approx(apart.solids, rel=1e-6, abs=1e-12)
    assert np.array_equal(np.isinf(together.log_activity), np.isinf(apart.log_activity))
