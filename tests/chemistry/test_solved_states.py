"""A state that was solved once is given again lane by lane, and is the state that the solver itself would give."""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry.equilibrium import solve
from carboy.chemistry.solved_states import SolvedStates
from carboy.vetting import laboratory

TOTALS = np.array([[0.3, 0.2], [0.1, 0.2], [-0.1, 0.3]])  # mol of H+ and CO3-2
WATER = np.full(3, 55.5)


@pytest.fixture
def counted(monkeypatch: pytest.MonkeyPatch) -> list[int]:
    """The lanes of each call that reaches the solver."""
    calls: list[int] = []

    def counting(network, totals, water, **options):  # type: ignore[no-untyped-def]
        calls.append(len(totals))
        return solve(network, totals, water, **options)

    monkeypatch.setattr("carboy.chemistry.solved_states.solve", counting)
    return calls


def _network():  # type: ignore[no-untyped-def]
    return laboratory().stock.networks.network(("CO3-2",))


def test_lanes_in_another_order_and_number_come_from_memory(counted: list[int]) -> None:
    states, network = SolvedStates(), _network()
    first = states.solve(network, TOTALS, WATER, headspace_L=None, start=None)
    again = states.solve(network, TOTALS[[2, 0, 2, 2]], WATER[[0] * 4], headspace_L=None, start=None)
    assert counted == [3]
    assert np.array_equal(again.pH, first.pH[[2, 0, 2, 2]])
    assert np.array_equal(again.gas, first.gas[[2, 0, 2, 2]])


def test_lanes_of_two_solutions_are_put_together(counted: list[int]) -> None:
    states, network = SolvedStates(), _network()
    alone = [states.solve(network, TOTALS[[k]], WATER[[k]], headspace_L=None, start=None) for k in range(3)]
    whole = states.solve(network, TOTALS, WATER, headspace_L=None, start=None)
    assert counted == [1, 1, 1]
    assert np.array_equal(whole.pH, np.concatenate([one.pH for one in alone]))
    fresh = solve(network, TOTALS, WATER)
    assert whole.pH == pytest.approx(fresh.pH, abs=1e-6)


def test_a_cap_makes_it_another_state(counted: list[int]) -> None:
    states, network = SolvedStates(), _network()
    states.solve(network, TOTALS, WATER, headspace_L=None, start=None)
    states.solve(network, TOTALS, WATER, headspace_L=np.full(3, 1.0), start=None)
    states.solve(network, TOTALS, WATER, headspace_L=np.full(3, 2.0), start=None)
    assert counted == [3, 3, 3]


def test_what_is_long_past_is_forgotten(counted: list[int]) -> None:
    states, network = SolvedStates(), _network()
    for k in range(70):  # more than are kept
        states.solve(network, TOTALS[:1] + 1e-3 * k, WATER[:1], headspace_L=None, start=None)
    states.solve(network, TOTALS[:1], WATER[:1], headspace_L=None, start=None)
    assert len(counted) == 71
    states.solve(network, TOTALS[:1] + 1e-3 * 69, WATER[:1], headspace_L=None, start=None)
    assert len(counted) == 71
