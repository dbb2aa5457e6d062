"""Zero totals, dry and drowned lanes, absurd strengths, starts from a neighbour, and what the caller gets wrong."""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry import equilibrium
from carboy.chemistry.equilibrium import solve
from tests.chemistry.mixtures import FACTORY, MOL_PER_KG, check, neutral, pressure, solid, solved, totals_of


def test_zero_totals_are_absence() -> None:
    network = FACTORY.network({"Na+", "Cl-", "CO3-2", "Hg+2", "HS-"})
    totals = totals_of(network, {"Na+": 0.1, "Cl-": 0.1}, {})
    answer = solve(network, totals, np.full(2, MOL_PER_KG))
    check(answer, totals, np.full(2, MOL_PER_KG))
    mercury = network.component_index["Hg+2"]
    assert answer.log_activity[0, mercury] == -np.inf
    assert np.all(answer.amounts[:, network.nu[:, mercury] != 0.0] == 0.0)
    assert np.all(answer.saturation == -np.inf)
    assert np.all(answer.pressures == 0.0)
    assert np.allclose(answer.pH, 7.0, atol=0.01)


def test_the_same_lane_with_and_without_absent_components() -> None:
    wide = FACTORY.network({"Na+", "Cl-", "Acetate-", "Cu+2", "Edta-4", "PO4-3"})
    narrow = FACTORY.network({"Na+", "Acetate-"})
    mixture = {"Na+": 0.05, "Acetate-": 0.1, "H+": 0.05}
    one = solve(wide, totals_of(wide, mixture), np.array([MOL_PER_KG]))
    other = solve(narrow, totals_of(narrow, mixture), np.array([MOL_PER_KG]))
    assert one.pH[0] == pytest.approx(other.pH[0], abs=1e-9)


def test_no_lanes() -> None:
    network = FACTORY.network({"Na+", "Cl-"})
    answer = solve(network, np.zeros((0, 3)), np.zeros(0))
    assert answer.pH.shape == (0,)
    assert answer.reasons == []


def test_dry_lanes_have_a_floor_of_water_and_are_marked() -> None:
    answer = solved({"Na+": 1.0, "H+": -1.0}, water_mol=1.0)
    assert answer.converged[0]
    assert answer.outside_activity_range[0]
    assert answer.water_kg[0] == pytest.approx(0.02)
    assert answer.pH[0] > 14.0
    empty = solved({}, water_mol=0.0)
    assert empty.converged[0]
    assert empty.outside_activity_range[0]


@pytest.mark.parametrize("strength", [0.6, 2.0, 6.0, 12.0, 20.0])
def test_strong_solutions_converge_and_are_marked(strength: float) -> None:
    for mixture in ({"Cl-": strength, "H+": strength}, {"Na+": strength, "H+": -strength}):
        answer = solved(mixture)
        assert answer.converged[0]
        assert answer.outside_activity_range[0]
    weak = solved({"Cl-": 0.3, "H+": 0.3})
    assert not weak.outside_activity_range[0]


@pytest.mark.parametrize("scale", [1e-9, 1e-3, 1e4])
def test_amounts_scale(scale: float) -> None:
    """A drop and a drum of the same solution are the same problem."""
    mixture = neutral({"Pb+2": 0.01, "CO3-2": 0.05, "SO4-2": 0.02, "H+": 0.08})
    one = solved(mixture)
    other = solved({token: scale * amount for token, amount in mixture.items()}, water_mol=scale * MOL_PER_KG)
    assert other.pH[0] == pytest.approx(one.pH[0], abs=1e-7)
    assert np.allclose(other.solids, scale * one.solids, rtol=1e-6, atol=1e-16 * scale)
    assert np.allclose(other.gas, scale * one.gas, rtol=1e-6, atol=1e-12 * scale)


def test_two_forms_of_one_solid() -> None:
    """Of two solids of the same composition the less soluble stands; the other is undersaturated by the difference."""
    network = FACTORY.network({"Hg+2", "HS-", "Na+", "NO3-"}, slow_solids=True)
    totals = totals_of(network, {"Hg+2": 0.001, "NO3-": 0.002, "HS-": 0.005, "Na+": 0.01, "H+": -0.005})
    answer = solve(network, totals, np.array([MOL_PER_KG]))
    check(answer, totals, np.array([MOL_PER_KG]))
    assert solid(answer, "Cinnabar") > 0.0009
    assert solid(answer, "Metacinnabar") == 0.0
    assert answer.saturation[0, network.solids.index("Metacinnabar")] == pytest.approx(-0.6, abs=1e-5)


def test_a_hydrate_beside_its_anhydrous_form() -> None:
    """Na2SO4 with and without 10 H2O together fix the activity of water: 10 log a = -1.114 - 0.3217, a = 0.718.

    With a = 1 - 0.017 sum(m) that is sum(m) = 16.6 mol/kg, and the balance of water says how much there is of each.
    """
    mixture = {"Na+": 12.0, "SO4-2": 4.0, "Cl-": 4.0}
    totals = totals_of(FACTORY.network(mixture), mixture)
    answer = solved(mixture)
    check(answer, totals, np.array([MOL_PER_KG]))
    assert solid(answer, "Mirabilite") > 0.1
    assert solid(answer, "Thenardite") > 0.1
    activity_of_water = 10.0 ** ((-1.114 - 0.3217) / 10.0)
    molality = answer.amounts[0].sum() / answer.water_kg[0]
    assert molality == pytest.approx((1.0 - activity_of_water) / 0.017, rel=1e-3)


def test_a_little_solid_without_any_buffer() -> None:
    """A trace of a strong base's worth of hydroxide in a strong salt: the proton balance is of terms of 1e-6 mol."""
    mixture = neutral({"Zn+2": 0.4, "Al+3": 1.4e-5, "Cl-": 0.5})
    totals = totals_of(FACTORY.network(mixture), mixture)
    check(solved(mixture), totals, np.array([MOL_PER_KG]))


def test_a_titration_in_one_call() -> None:
    """41 lanes of a ten-component waste from acid to alkaline: all converge, in few turns, the pH rising throughout."""
    waste = {
        "Zn+2": 0.02, "Cu+2": 0.02, "Fe+3": 0.02, "Ni+2": 0.02, "Ca+2": 0.02, "Pb+2": 0.002, "Al+3": 0.01,
        "SO4-2": 0.1, "CO3-2": 0.001, "Acetate-": 0.02, "NO3-": 0.2, "H+": 0.05,
    }  # fmt: skip
    waste = neutral(waste)
    lanes = [{**waste, "Na+": waste.get("Na+", 0.0) + base, "H+": 0.05 - base} for base in np.linspace(0.0, 0.6, 41)]
    answer = solved(*lanes, retain_gas=True)
    assert answer.converged.all()
    assert np.all(np.diff(answer.pH) > 0.0)
    assert answer.iterations.max() < 60
    assert answer.pH[0] < 2.5
    assert answer.pH[-1] > 11.5


def test_retained_gas_shows_the_pressure_it_would_have() -> None:
    mixture = {"Na+": 1.0, "CO3-2": 1.0, "H+": 2.0, "Cl-": 1.0}
    answer = solved(mixture, retain_gas=True)
    assert answer.gas.sum() == 0.0
    assert not answer.bubbling[0]
    assert pressure(answer, "CO2(g)") > 20.0


def test_several_gases_bubble_together() -> None:
    mixture = {"Na+": 2.0, "CO3-2": 0.5, "HS-": 1.0, "H+": 2.0, "Cl-": 2.0}
    totals = totals_of(FACTORY.network(mixture), mixture)
    answer = solved(mixture)
    check(answer, totals, np.array([MOL_PER_KG]), available_atm=1.0 - 0.031271)
    assert answer.bubbling[0]
    assert (answer.gas[0] > 0.05).sum() == 2


def test_thinner_air_lets_more_out() -> None:
    mixture = {"Na+": 0.1, "CO3-2": 0.1, "H+": 0.2, "Cl-": 0.1}
    assert solved(mixture, ambient_atm=0.6).gas.sum() > solved(mixture).gas.sum() > 0.0


def test_sealed_without_headspace_keeps_everything_dissolved() -> None:
    mixture = {"Na+": 0.1, "CO3-2": 0.1, "H+": 0.2, "Cl-": 0.1}
    closed = solved(mixture, headspace_L=0.0)
    retained = solved(mixture, retain_gas=True)
    assert closed.converged[0]
    assert closed.gas.sum() == pytest.approx(0.0, abs=1e-20)
    assert closed.pH[0] == pytest.approx(retained.pH[0], abs=1e-9)


def test_an_inert_dissolved_gas_without_equilibria() -> None:
    answer = solved({"N2": 0.001, "Na+": 0.01, "Cl-": 0.01})
    assert answer.converged[0]
    assert answer.amounts[0, answer.network.species_index["N2"]] == pytest.approx(0.001, rel=1e-9)


def test_a_start_gives_the_same_answer_in_fewer_turns() -> None:
    mixtures = [neutral({"Cu+2": 0.01, "SO4-2": 0.02, "HS-": 0.002 * k, "H+": 0.01 - 0.001 * k}) for k in range(8)]
    cold = solved(*mixtures)
    network = cold.network
    totals = totals_of(network, *mixtures)
    water = np.full(len(mixtures), MOL_PER_KG)
    warm = solve(network, totals * 1.001, water, start=cold)
    fresh = solve(network, totals * 1.001, water)
    assert warm.converged.all()
    assert np.allclose(warm.pH, fresh.pH, atol=1e-7)
    assert np.allclose(warm.solids, fresh.solids, rtol=1e-6, atol=1e-14)
    assert warm.iterations.sum() < fresh.iterations.sum()
    one = solve(network, totals[3:4], water[:1])
    spread = solve(network, totals, water, start=one)
    assert spread.converged.all()
    assert np.allclose(spread.pH, cold.pH, atol=1e-7)


def test_what_the_caller_gets_wrong() -> None:
    network = FACTORY.network({"Na+", "Cl-"})
    water = np.array([MOL_PER_KG])
    totals = totals_of(network, {"Na+": 0.1, "Cl-": 0.1})
    with pytest.raises(ValueError, match=r"Cl-.*negative"):
        solve(network, totals_of(network, {"Cl-": -0.1}), water)
    with pytest.raises(ValueError, match="columns"):
        solve(network, totals[:, :2], water)
    with pytest.raises(ValueError, match="finite"):
        solve(network, totals * np.nan, water)
    with pytest.raises(ValueError, match="water"):
        solve(network, totals, -water)
    with pytest.raises(ValueError, match="headspace"):
        solve(network, totals, water, headspace_L=np.array([-1.0]))
    with pytest.raises(ValueError, match="ambient"):
        solve(network, totals, water, ambient_atm=0.0)


def test_totals_are_not_changed() -> None:
    network = FACTORY.network({"Na+", "Cl-", "CO3-2"})
    totals = totals_of(network, {"Na+": 0.3, "CO3-2": 0.1, "Cl-": 0.1})
    water = np.array([MOL_PER_KG])
    before = totals.copy()
    solve(network, totals, water)
    assert np.array_equal(totals, before)
    assert water[0] == MOL_PER_KG


def test_a_lane_that_is_not_solved_says_why(monkeypatch: pytest.MonkeyPatch) -> None:
    """With the last stage taken out the iterate is no solution, and is not passed off as one."""

    def nothing(
        terms: object, lanes: object, state: object, present: np.ndarray, **options: object
    ) -> tuple[np.ndarray, np.ndarray]:
        return np.zeros(len(present), dtype=bool), np.zeros(len(present), dtype=np.intp)

    monkeypatch.setattr(equilibrium, "finish", nothing)
    answer = solved({"Na+": 0.1, "CO3-2": 0.1, "H+": 0.1, "Ca+2": 0.05, "Cl-": 0.1})
    assert not answer.converged[0]
    assert answer.reasons[0]
