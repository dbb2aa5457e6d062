"""Problems for the solver and checks of its answers that share no code with it."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from carboy.chemistry.equilibrium import Solved, solve
from carboy.chemistry.network import Network, NetworkFactory
from tests.chemistry.aqueous_records import COMPONENTS, EQUILIBRIA, SPECIES

KG_PER_MOL = 0.01801528
MOL_PER_KG = 1.0 / KG_PER_MOL
FACTORY = NetworkFactory(EQUILIBRIA, SPECIES)


def totals_of(network: Network, *mixtures: Mapping[str, float]) -> np.ndarray:
    """[L, C] from one mapping a lane."""
    made = np.zeros((len(mixtures), len(network.components)))
    for lane, mixture in enumerate(mixtures):
        for token, amount in mixture.items():
            made[lane, network.component_index[token]] = amount
    return made


def solved(
    *mixtures: Mapping[str, float], water_mol: float = MOL_PER_KG, temperature_C: float = 25.0, **options: object
) -> Solved:
    """The mixtures (mol by component) as lanes of one call."""
    tokens = {token for mixture in mixtures for token in mixture}
    network = FACTORY.network(tokens, temperature_C)
    headspace = options.pop("headspace_L", None)
    return solve(
        network,
        totals_of(network, *mixtures),
        np.full(len(mixtures), water_mol),
        headspace_L=None if headspace is None else np.full(len(mixtures), headspace),
        **options,  # type: ignore[arg-type]
    )


def neutral(mixture: Mapping[str, float]) -> dict[str, float]:
    """The mixture with sodium or chloride added until its charges cancel."""
    made = dict(mixture)
    excess = sum(COMPONENTS[token] * amount for token, amount in made.items())
    ion = "Na+" if excess < 0 else "Cl-"
    made[ion] = made.get(ion, 0.0) + abs(excess)
    return made


def of(answer: Solved, token: str, lane: int = 0) -> float:
    """mol of a dissolved species."""
    return float(answer.amounts[lane, answer.network.species_index[token]])


def solid(answer: Solved, name: str, lane: int = 0) -> float:
    """mol of a solid."""
    return float(answer.solids[lane, answer.network.solids.index(name)])


def gas(answer: Solved, name: str, lane: int = 0) -> float:
    """mol of a gas."""
    return float(answer.gas[lane, answer.network.gases.index(name)])


def pressure(answer: Solved, name: str, lane: int = 0) -> float:
    """Partial pressure of a gas, atm."""
    return float(answer.pressures[lane, answer.network.gases.index(name)])


def dissolved(answer: Solved, component: str, lane: int = 0) -> float:
    """mol of a component in all its dissolved species."""
    network = answer.network
    return float(answer.amounts[lane] @ network.nu[:, network.component_index[component]])


def check(answer: Solved, totals: np.ndarray, water_mol: np.ndarray, *, available_atm: float | None = None) -> None:
    """Fail with whatever is wrong with an answer."""
    assert answer.converged.all(), [reason for reason in answer.reasons if reason]
    assert faults(answer, totals, water_mol, available_atm=available_atm) == []


def faults(
    answer: Solved, totals: np.ndarray, water_mol: np.ndarray, *, available_atm: float | None = None
) -> list[str]:
    """What is wrong with mass, charge, water, mass action, saturation and gas pressure of each lane, from the arrays of
    the answer alone. The activity model is written out here a second time. 25 degC.
    """
    found: list[str] = []

    def ask(holds: object, what: str, lane: int | None = None) -> None:
        if not np.all(holds):
            where = "" if lane is None else f"lane {lane}: "
            found.append(where + what)

    network = answer.network
    mass = answer.amounts @ network.nu + answer.solids @ network.solid_nu + answer.gas @ network.gas_nu
    gross = answer.amounts @ np.abs(network.nu) + answer.solids @ np.abs(network.solid_nu)
    gross += answer.gas @ np.abs(network.gas_nu) + np.abs(totals)
    ask(np.abs(mass - totals) <= 1e-9 * gross + 1e-300, "a component's balance is open")
    charges = totals @ network.component_charge
    ions = answer.amounts @ np.abs(network.charge) + np.abs(totals) @ np.abs(network.component_charge)
    ask(np.abs(answer.amounts @ network.charge - charges) <= 1e-9 * ions + 1e-300, "the charge is open")
    kg = answer.water_kg
    on_floor = kg <= 1.000001 * np.maximum(totals[:, 1:].sum(axis=1) / 50.0, 1e-9)
    water = kg / KG_PER_MOL + answer.amounts @ network.nu_water + answer.solids @ network.solid_nu_water
    water += answer.gas @ network.gas_nu_water
    ask((np.abs(water - water_mol) <= 1e-8 * water_mol) | on_floor, "the water is open")
    ask(answer.outside_activity_range[on_floor], "a lane on the floor of water is not marked")
    molality = answer.amounts / kg[:, None]
    strength = 0.5 * molality @ network.charge**2
    ask(np.isclose(strength, answer.ionic_strength, rtol=1e-7, atol=1e-10), "the ionic strength is another")
    for lane in range(totals.shape[0]):
        i, m = strength[lane], molality[lane].sum()
        held = min(i, 0.394979339)
        davies = -0.509 * (np.sqrt(held) / (1.0 + np.sqrt(held)) - 0.3 * held)
        log_gamma = np.where(network.charge == 0.0, 0.1 * min(i, 5.0), davies * network.charge**2)
        # strong acid: the interaction comes in between 0.1 and 0.5 mol/kg of H+, and molalities above 20 count as 20
        part = max(1.0 - 0.394979339 / max(i, 0.394979339), 0.0) * np.clip((molality[lane, 0] - 0.1) / 0.4, 0.0, 1.0)
        log_gamma[0] += part * (np.minimum(molality[lane], 20.0) * network.acid_interaction).sum()
        log_gamma += part * min(molality[lane, 0], 20.0) * network.acid_interaction
        log_water = np.log10(1.0 - 0.017 * min(m, 20.0)) - 0.017 / 0.66 / np.log(10.0) * np.clip(m - 20.0, 0.0, 40.0)
        present = totals[lane] != 0.0
        present[0] = True
        there = (network.nu[:, ~present] == 0.0).all(axis=1)
        log_a = np.where(present, answer.log_activity[lane], 0.0)
        wanted = network.log_beta + network.nu @ log_a + network.nu_water * log_water - log_gamma
        big = there & (wanted > -250.0)
        ask(np.isclose(np.log10(molality[lane, big]), wanted[big], atol=1e-6), "mass action fails", lane)
        ask(answer.amounts[lane, ~there] == 0.0, "a species of an absent component", lane)
        index = network.solid_log_beta + network.solid_nu @ log_a + network.solid_nu_water * log_water
        can = (network.solid_nu[:, ~present] == 0.0).all(axis=1)
        ask(index[can] <= 1e-6, "a solid is supersaturated", lane)
        held_solids = answer.solids[lane] > 1e-12 * gross[lane].max()
        ask(np.abs(index[held_solids]) <= 1e-6, "a solid that is present is undersaturated", lane)
        ask(answer.solids[lane] >= 0.0, "less than none of a solid", lane)
        ask(answer.solids[lane, ~can] == 0.0, "a solid of an absent component", lane)
        pressures = 10.0 ** (network.gas_log_beta + network.gas_nu @ log_a + network.gas_nu_water * log_water)
        can_gas = (network.gas_nu[:, ~present] == 0.0).all(axis=1)
        close = np.isclose(answer.pressures[lane], np.where(can_gas, pressures, 0.0), rtol=1e-5, atol=1e-300)
        ask(close, "a pressure is another", lane)
        if available_atm is not None:
            total = answer.pressures[lane].sum()
            ask(total <= available_atm * (1.0 + 1e-5), "the gases' pressure is above that of the surroundings", lane)
            if answer.bubbling[lane]:
                ask(np.isclose(total, available_atm, rtol=1e-5), "bubbles at less than their pressure", lane)
                shares = answer.pressures[lane] / total
                close = np.isclose(answer.gas[lane], shares * answer.gas[lane].sum(), rtol=1e-6, atol=1e-300)
                ask(close, "bubbles of another composition", lane)
    return found
