"""What is in a vessel, in many lanes at once, and its speciation.

A *lane* is one possibility: one corner of the stated ranges at one point of an addition. All amounts are arrays of
shape ``[lanes]`` in mol of components (``H+`` is the proton excess and may be negative).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from carboy.chemistry.equilibrium import Solved
from carboy.chemistry.network import Network
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock

Array = NDArray[np.float64]

WATER_MOLAR_MASS = 18.01528  # g/mol, IUPAC 2021
TRACE = 1e-9  # mol; less than this is not there


@dataclass
class Mixture:
    """The content of a vessel.

    ``neat``: substance id -> kJ/mol that it still gives or takes on dissolving (None unknown), for a portion not yet in water.
    ``amounts``: token -> mol ``[L]``: components, water, and things that stand aside. ``labelled``: substance id -> mol ``[L]`` put in
    under that name. ``volume_L``, ``mass_g``: of the liquid and solids. ``headspace_L``: None when open. ``air_mol``: air shut in.
    """

    stock: ChemicalStock
    amounts: dict[str, Array]
    labelled: dict[str, Array]
    volume_L: Array
    mass_g: Array
    temperature_C: Array
    headspace_L: Array | None = None
    air_mol: Array | None = None
    network_temperature_C: float = 25.0
    neat: dict[str, float | None] = field(default_factory=dict)
    hint: Solved | None = field(default=None, repr=False)

    @property
    def lanes(self) -> int:
        return len(self.volume_L)

    def zeros(self) -> Array:
        return np.zeros(self.lanes)

    def total(self, token: str) -> Array:
        """mol of a component, however bound."""
        found = self.amounts.get(token)
        return found if found is not None else self.zeros()

    @cached_property
    def dissolvable(self) -> tuple[str, ...]:
        """The components that the equilibria see."""
        return tuple(
            sorted(
                token
                for token, amount in self.amounts.items()
                if token not in (WATER, PROTON) and self.stock.kind(token) == "component" and np.any(amount > 0)
            )
        )

    @cached_property
    def solved(self) -> Solved | None:
        """Speciation; None where there is nothing ionic (a neat solvent) or nothing in water yet (a dry salt, a neat acid): no pH there."""
        if not self.ionises:
            return None
        network, totals, water = self._system()
        start = self.hint if self.hint is not None and self.hint.network is network else None
        return self.stock.solved_states.solve(network, totals, water, headspace_L=self.headspace_L, start=start)

    @property
    def ionises(self) -> bool:
        """Whether there is anything that the equilibria are about, and water or a medium for it."""
        return not self.neat and (
            bool(self.dissolvable)
            or bool(np.any(np.abs(self.total(PROTON)) > TRACE))
            or bool(np.any(self.total(WATER) > 0))
        )

    def _system(self) -> tuple[Network, Array, Array]:
        """The network, mol of its components ``[L, C]`` and mol of water ``[L]``."""
        network = self.stock.networks.network(self.dissolvable, self.network_temperature_C)
        totals = np.stack([self.total(token) for token in network.components], axis=1)
        for column, token in enumerate(network.components):
            if token != PROTON:
                np.maximum(totals[:, column], 0.0, out=totals[:, column])
        # a dry salt that takes up water may ask for more than the first drop brings
        return network, totals, np.maximum(self.total(WATER), 0.0)

    @property
    def pH(self) -> Array:
        """``[L]``; nan where pH has no meaning."""
        return np.full(self.lanes, np.nan) if self.solved is None else self.solved.pH

    @property
    def converged(self) -> NDArray[np.bool_]:
        return np.ones(self.lanes, dtype=bool) if self.solved is None else self.solved.converged

    @cached_property
    def solids(self) -> dict[str, Array]:
        """mol of each equilibrium solid that is there in some lane."""
        if self.solved is None:
            return {}
        return {
            token: self.solved.solids[:, column]
            for column, token in enumerate(self.solved.network.solids)
            if np.any(self.solved.solids[:, column] > TRACE)
        }

    @cached_property
    def gases(self) -> dict[str, Array]:
        """mol of each gas in the gas phase (bubbles of an open vessel, headspace of a sealed one)."""
        if self.solved is None:
            return self._evolved()
        return {token: self.solved.gas[:, column] for column, token in enumerate(self.solved.network.gases)}

    def _evolved(self) -> dict[str, Array]:
        """Where no water holds it, all of a gas that has formed, which no label brought, has left the rest."""
        found = {}
        for gas, molecule in self.stock.dissolved_form.items():
            if molecule in self.amounts and self.stock.kind(molecule) == "component":
                put_in = sum(
                    (moles * self.stock.yield_of(name).get(molecule, 0.0) for name, moles in self.labelled.items()),
                    self.zeros(),
                )
                formed = self.amounts[molecule] - put_in
                if np.any(formed > TRACE):
                    found[gas] = np.maximum(formed, 0.0)
        return found

    @cached_property
    def pressures(self) -> dict[str, Array]:
        """atm over the liquid of each gas."""
        if self.solved is None:
            return {token: np.where(amount > TRACE, 1.0, 0.0) for token, amount in self.gases.items()}
        return {token: self.solved.pressures[:, column] for column, token in enumerate(self.solved.network.gases)}

    @cached_property
    def aqueous(self) -> dict[str, Array]:
        """mol of each aqueous species."""
        if self.solved is None:
            return {}
        return {token: self.solved.amounts[:, column] for column, token in enumerate(self.solved.network.species)}

    @cached_property
    def aside(self) -> dict[str, Array]:
        """mol of what stands aside: metals, insoluble solids, organic liquids."""
        return {
            token: amount
            for token, amount in self.amounts.items()
            if token not in (WATER, PROTON) and self.stock.kind(token) == "aside" and np.any(amount > TRACE)
        }

    def dissolved(self, token: str) -> Array:
        """mol of a component in the liquid, all its forms together."""
        amount = self.total(token).copy()
        for solid, present in self.solids.items():
            amount -= present * self.stock.components_of(solid).get(token, 0.0)
        for gas, present in self.gases.items():
            amount -= present * self.stock.components_of(gas).get(token, 0.0)
        return np.maximum(amount, 0.0)

    def amount_of(self, token: str) -> Array:
        """mol of a species, or of a component's dissolved family, or of a labelled substance that is still itself.

        Of what nothing has ionised the protons and hydroxide are those that it would bring to water.
        """
        if token in self.stock.index.species or token == WATER:
            kind = self.stock.kind(token)
            if kind == "water":
                return self.total(WATER)
            if token == PROTON:
                return np.maximum(self.total(PROTON), 0.0)
            if kind == "component":
                return self.dissolved(token)
            if kind == "aside":
                return self.total(token)
            if kind == "solid":
                return self.solids.get(token, self.zeros())
            if kind == "gas":
                return self.gases.get(token, self.zeros())
            if self.solved is None and set(self.stock.components_of(token)) == {PROTON, WATER}:
                return np.maximum(self.total(PROTON) * np.sign(self.stock.components_of(token)[PROTON]), 0.0)
            return self.aqueous.get(token, self.zeros())
        return self.remaining(token)

    def remaining(self, substance_id: str) -> Array:
        """mol of a labelled substance that can still act as such: no more than was put in, than is left of each of its ions, and for
        an acid or base than is left of the proton excess or deficit."""
        left = self.labelled.get(substance_id)
        if left is None:
            return self.zeros()
        left = left.copy()
        for token, count in self.stock.yield_of(substance_id).items():
            if token == WATER:
                continue
            have = self.total(token) * np.sign(count)
            left = np.minimum(left, np.maximum(have, 0.0) / abs(count))
        return left

    @property
    def water_kg(self) -> Array:
        return np.maximum(self.total(WATER), 0.0) * WATER_MOLAR_MASS / 1000.0

    @property
    def water_fraction(self) -> Array:
        """kg of water per kg of content."""
        return np.divide(self.water_kg * 1000.0, self.mass_g, out=self.zeros(), where=self.mass_g > 0)

    def strength(self, token: str) -> Array:
        """mol/L of the whole content."""
        return np.divide(self.amount_of(token), self.volume_L, out=self.zeros(), where=self.volume_L > 0)

    def gauge_kPa(self) -> Array:
        """Pressure above the atmosphere of a sealed vessel; zero for an open one."""
        if self.headspace_L is None or self.air_mol is None:
            return self.zeros()
        kelvin = self.temperature_C + 273.15
        room = np.maximum(self.headspace_L, 1e-6)
        moles = self.air_mol + sum(self.gases.values(), self.zeros())
        return moles * GAS_CONSTANT_KPA * kelvin / room + water_vapour_kPa(self.temperature_C) - ATMOSPHERE_KPA

    def with_amounts(self, amounts: dict[str, Array]) -> Mixture:
        """The same vessel with other amounts (after a reaction): volume and mass are kept."""
        return Mixture(
            self.stock,
            amounts,
            self.labelled,
            self.volume_L,
            self.mass_g,
            self.temperature_C,
            self.headspace_L,
            self.air_mol,
            self.network_temperature_C,
            self.neat,
            hint=self.__dict__.get("solved", self.hint),
        )

    def take(self, lanes: NDArray[np.intp] | NDArray[np.bool_]) -> Mixture:
        """Some of the lanes."""
        return self._map(lambda values: values[lanes])

    def scaled(self, factor: Array | float) -> Mixture:
        """A share of the content (extensive amounts times ``factor``)."""
        part = self._map(lambda values: values)
        part.amounts = {token: amount * factor for token, amount in self.amounts.items()}
        part.labelled = {token: amount * factor for token, amount in self.labelled.items()}
        part.volume_L = self.volume_L * factor
        part.mass_g = self.mass_g * factor
        return part

    def repeated(self, times: int) -> Mixture:
        """Each lane ``times`` times in a row."""
        return self._map(lambda values: np.repeat(values, times))

    def _map(self, change) -> Mixture:  # type: ignore[no-untyped-def]
        return Mixture(
            self.stock,
            {token: change(amount) for token, amount in self.amounts.items()},
            {token: change(amount) for token, amount in self.labelled.items()},
            change(self.volume_L),
            change(self.mass_g),
            change(self.temperature_C),
            None if self.headspace_L is None else change(self.headspace_L),
            None if self.air_mol is None else change(self.air_mol),
            self.network_temperature_C,
            dict(self.neat),
        )


def solve_together(first: Mixture, second: Mixture) -> None:
    """Solve two open contents of the same components in one go, which takes little longer than one of them; nothing otherwise."""
    if first.headspace_L is None and second.headspace_L is None and first.ionises and second.ionises:
        (network, totals, water), (other, more, drops) = first._system(), second._system()
        if network is other:
            whole, liquid = np.concatenate([totals, more]), np.concatenate([water, drops])
            first.stock.solved_states.solve(network, whole, liquid, headspace_L=None, start=None)


def poured_together(first: Mixture, second: Mixture) -> Mixture:
    """Two contents in one vessel: amounts, volumes and masses add; the temperature is that of the mixed heat capacity (before any heat
    of reaction). Cover and headspace are the first one's and must be set again by the caller."""
    tokens = {**first.amounts, **second.amounts}
    dry = _waterless(first) and _waterless(second)
    names = {**first.labelled, **second.labelled}
    mass = first.mass_g + second.mass_g
    heavy = np.where(mass > 0, mass, 1.0)
    return Mixture(
        first.stock,
        {token: first.total(token) + second.total(token) for token in tokens},
        {name: first.labelled.get(name, first.zeros()) + second.labelled.get(name, second.zeros()) for name in names},
        first.volume_L + second.volume_L,
        mass,
        np.where(mass > 0, (first.temperature_C * first.mass_g + second.temperature_C * second.mass_g) / heavy, 25.0),
        None,
        None,
        first.network_temperature_C,
        {**first.neat, **second.neat} if dry else {},
    )


def _waterless(content: Mixture) -> bool:
    """Whether nothing ionises in it: no water has touched it, and it brings no medium of its own. Nothing at all is waterless too."""
    return not content.amounts or (
        bool(content.neat) and not any(_ionises_by_itself(content.stock, name) for name in content.neat)
    )


def _ionises_by_itself(stock: ChemicalStock, substance_id: str) -> bool:
    """A liquid acid or base meets a salt as it would in water, and so does a gas that is an acid before it finds water."""
    brought = stock.yield_of(substance_id)
    state = stock.index.substances[substance_id].state
    return abs(brought.get(PROTON, 0.0)) > 0 and (state == "l" or (state == "g" and brought.get(WATER, 0.0) >= 0))


def empty(stock: ChemicalStock, lanes: int, temperature_C: float) -> Mixture:
    """An empty vessel."""
    none = np.zeros(lanes)
    return Mixture(stock, {}, {}, none, none.copy(), np.full(lanes, temperature_C))


ATMOSPHERE_KPA = 101.325
GAS_CONSTANT_KPA = 8.314462618  # kPa L / (mol K)


def water_vapour_kPa(temperature_C: Array) -> Array:
    """Vapour pressure of water, kPa, 1 to 100 degC. Antoine equation, constants of the NIST Chemistry WebBook form as used in
    Reid, Prausnitz and Poling (A = 8.07131, B = 1730.63, C = 233.426, mmHg), from memory."""
    held = np.clip(temperature_C, 0.0, 150.0)
    return 0.133322 * 10.0 ** (8.07131 - 1730.63 / (233.426 + held))
