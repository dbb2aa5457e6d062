"""Balances, mass action and saturation of answers to drawn mixtures."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from carboy.chemistry.equilibrium import solve
from tests.chemistry.aqueous_records import COMPONENTS
from tests.chemistry.mixtures import FACTORY, MOL_PER_KG, check, neutral, totals_of

AVAILABLE = 1.0 - 0.031271  # atm less the vapour pressure of water at 25 degC (check of it in test_gas_law)
TOKENS = sorted(set(COMPONENTS) - {"H+", "N2"})
amounts = st.one_of(st.just(0.0), st.floats(-6.0, 0.3).map(lambda power: 10.0**power))
mixtures = st.dictionaries(st.sampled_from(TOKENS), amounts, min_size=1, max_size=8)
powers = st.floats(-6.0, 0.5)
protons = st.one_of(st.just(0.0), powers.map(lambda p: 10.0**p), powers.map(lambda p: -(10.0**p)))


@settings(max_examples=60, deadline=None, derandomize=True)
@given(st.lists(st.tuples(mixtures, protons), min_size=1, max_size=4), st.sampled_from(["open", "sealed", "retained"]))
def test_neutral_mixtures(drawn: list[tuple[dict[str, float], float]], vessel: str) -> None:
    lanes = [neutral({**mixture, "H+": excess}) for mixture, excess in drawn]
    network = FACTORY.network({token for lane in lanes for token in lane})
    totals = totals_of(network, *lanes)
    water = np.full(len(lanes), MOL_PER_KG)
    answer = solve(
        network,
        totals,
        water,
        headspace_L=np.full(len(lanes), 0.7) if vessel == "sealed" else None,
        retain_gas=vessel == "retained",
    )
    check(answer, totals, water, available_atm=AVAILABLE if vessel == "open" else None)
    if vessel == "sealed":
        assert np.allclose(answer.gas, answer.pressures * 0.7 / (0.082057 * 298.15), rtol=1e-6)
    if vessel == "retained":
        assert not answer.gas.any()


@settings(max_examples=25, deadline=None, derandomize=True)
@given(mixtures, protons, st.floats(-3.0, 1.0), st.floats(-3.0, 0.0))
def test_any_totals_and_strength(mixture: dict[str, float], excess: float, strength: float, dryness: float) -> None:
    """Totals that are not neutral, up to far beyond what dissolves, in little water."""
    scaled = {token: 10.0**strength * amount for token, amount in mixture.items()}
    network = FACTORY.network(scaled)
    totals = totals_of(network, {**scaled, "H+": excess})
    water = np.array([MOL_PER_KG * 10.0**dryness])
    check(solve(network, totals, water), totals, water, available_atm=AVAILABLE)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(mixtures, st.floats(0.001, 0.5))
def test_more_acid_never_raises_the_ph(mixture: dict[str, float], acid: float) -> None:
    base = neutral({**mixture, "H+": 0.0})
    steps = [{**base, "H+": acid * k, "Cl-": base.get("Cl-", 0.0) + acid * k} for k in range(5)]
    network = FACTORY.network({token for lane in steps for token in lane})
    answer = solve(network, totals_of(network, *steps), np.full(5, MOL_PER_KG), retain_gas=True)
    assert answer.converged.all()
    inside = ~answer.outside_activity_range
    assert np.all(np.diff(answer.pH[inside]) < 1e-6)
