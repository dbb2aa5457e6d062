"""The equilibria reduced to what can form from the components at hand, as arrays for the solver."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from carboy.errors import KnowledgeError
from carboy.model.knowledge import Equilibrium, Species

FloatArray = NDArray[np.float64]

GAS_CONSTANT_KJ = 8.31446e-3  # kJ/mol/K, CODATA 2018
ZERO_CELSIUS = 273.15  # K
REFERENCE_KELVIN = 298.15  # K, temperature of the stored constants
_ALWAYS = frozenset({"H+", "H2O"})


@dataclass(frozen=True, eq=False)
class Network:
    """Species, solids and gases over a set of C components; all arrays are read-only.

    ``log10 a(species) = log_beta + nu @ log10 a(components) + nu_water * log10 a(water)``; the same form gives the
    saturation ratio of a solid and the partial pressure (atm) of a gas. ``components[0]`` is ``H+``; ``H2O`` is not
    among them. ``species`` begins with the components themselves, in their order.
    """

    components: tuple[str, ...]
    species: tuple[str, ...]
    nu: FloatArray  # [S, C]
    nu_water: FloatArray  # [S]
    log_beta: FloatArray  # [S]
    charge: FloatArray  # [S]
    acid_interaction: FloatArray  # [S] with H+, log10, kg/mol; zero where none is known
    solids: tuple[str, ...]
    solid_nu: FloatArray  # [M, C]
    solid_nu_water: FloatArray  # [M]
    solid_log_beta: FloatArray  # [M]
    gases: tuple[str, ...]
    gas_nu: FloatArray  # [G, C]
    gas_nu_water: FloatArray  # [G]
    gas_log_beta: FloatArray  # [G]
    temperature_C: float = 25.0
    uncorrected: tuple[str, ...] = field(
        default=()
    )  # products whose enthalpy is unknown: their constant is that of 25 degC

    @cached_property
    def component_index(self) -> dict[str, int]:
        """Column of each component."""
        return {token: column for column, token in enumerate(self.components)}

    @cached_property
    def species_index(self) -> dict[str, int]:
        """Row of each aqueous species."""
        return {token: row for row, token in enumerate(self.species)}

    @property
    def component_charge(self) -> FloatArray:
        """Charges of the components, [C]."""
        return self.charge[: len(self.components)]


class NetworkFactory:
    """Builds networks from one body of equilibria and keeps the latest ones.

    Equilibria are indexed once by the components they need, so that a network costs in proportion to what it holds
    and not to the size of the body.
    """

    def __init__(self, equilibria: Sequence[Equilibrium], species: Mapping[str, Species], *, keep: int = 256) -> None:
        self._equilibria = tuple(equilibria)
        self._species = species
        self._keep = keep
        self._cache: OrderedDict[tuple[tuple[str, ...], float, bool], Network] = OrderedDict()
        self._needs = tuple(frozenset(row.coefficients) - _ALWAYS for row in self._equilibria)
        self._by_component: dict[str, list[int]] = {}
        self._without: list[int] = []  # made of H+ and H2O alone
        self._made_of: dict[str, int] = {}
        for number, (row, needs) in enumerate(zip(self._equilibria, self._needs, strict=True)):
            for token in needs:
                self._by_component.setdefault(token, []).append(number)
            if not needs:
                self._without.append(number)
            if row.kind == "aqueous":
                self._made_of.setdefault(row.product, number)

    def network(self, components: Iterable[str], temperature_C: float = 25.0, *, slow_solids: bool = False) -> Network:
        """The network of ``components`` at a temperature (degC); the same object for the same question.

        Raises KnowledgeError where a component is unknown, is itself formed from other components, or where the
        charge of a species disagrees with its reaction.
        """
        tokens = ("H+", *sorted(set(components) - _ALWAYS))
        key = (tokens, float(temperature_C), slow_solids)
        found = self._cache.get(key)
        if found is not None:
            self._cache.move_to_end(key)
            return found
        made = self._build(tokens, float(temperature_C), slow_solids)
        self._cache[key] = made
        if len(self._cache) > self._keep:
            self._cache.popitem(last=False)
        return made

    def _charge(self, token: str) -> float:
        record = self._species.get(token)
        if record is None:
            if token == "H+":
                return 1.0
            raise KnowledgeError(f"the species '{token}' is used as a component but is not described")
        return float(record.charge)

    def _interaction(self, token: str) -> float:
        record = self._species.get(token)
        return 0.0 if record is None or record.acid_interaction is None else record.acid_interaction.magnitude

    def _chosen(self, tokens: tuple[str, ...]) -> list[Equilibrium]:
        present = set(tokens)
        numbers = set(self._without)
        for token in tokens:
            numbers.update(number for number in self._by_component.get(token, ()) if self._needs[number] <= present)
        return [self._equilibria[number] for number in sorted(numbers)]

    def _build(self, tokens: tuple[str, ...], temperature_C: float, slow_solids: bool) -> Network:
        for token in tokens:
            if token in self._made_of:
                reaction = self._equilibria[self._made_of[token]].reaction
                raise KnowledgeError(f"'{token}' cannot be a component, because it is formed from others ({reaction})")
        charges = {token: self._charge(token) for token in tokens}
        aqueous: list[Equilibrium] = []
        solid: list[Equilibrium] = []
        gas: list[Equilibrium] = []
        for row in self._chosen(tokens):
            if row.kind == "aqueous":
                aqueous.append(row)
            elif row.kind == "gas":
                if frozenset(row.coefficients) - {"H2O"}:  # water vapour is kept apart, by its vapour pressure
                    gas.append(row)
            else:
                record = self._species.get(row.product)
                if slow_solids or record is None or record.forms != "slow":
                    solid.append(row)
        names = tokens + tuple(row.product for row in aqueous)
        if len(set(names)) != len(names):
            twice = sorted({name for name in names if names.count(name) > 1})
            raise KnowledgeError(f"more than one equilibrium forms {', '.join(twice)}")
        formed_charges = [sum(n * charges.get(c, 0.0) for c, n in row.coefficients.items()) for row in aqueous]
        for row, value in zip(aqueous, formed_charges, strict=True):
            record = self._species.get(row.product)
            if record is not None and abs(record.charge - value) > 1e-9:
                raise KnowledgeError(
                    f"the charge of '{row.product}' is {record.charge}, but its reaction gives {value:g}"
                )
        for row in (*solid, *gas):
            if abs(sum(n * charges.get(c, 0.0) for c, n in row.coefficients.items())) > 1e-9:
                raise KnowledgeError(f"the reaction of '{row.product}' does not balance in charge")
        nu, nu_water, log_beta = _arrays(aqueous, tokens, temperature_C)
        solid_nu, solid_nu_water, solid_log_beta = _arrays(solid, tokens, temperature_C)
        gas_nu, gas_nu_water, gas_log_beta = _arrays(gas, tokens, temperature_C)
        shifted = abs(temperature_C + ZERO_CELSIUS - REFERENCE_KELVIN) > 1e-9
        return Network(
            components=tokens,
            species=names,
            nu=_fixed(np.vstack([np.eye(len(tokens)), nu])),
            nu_water=_fixed(np.concatenate([np.zeros(len(tokens)), nu_water])),
            log_beta=_fixed(np.concatenate([np.zeros(len(tokens)), log_beta])),
            charge=_fixed(np.array([*(charges[token] for token in tokens), *formed_charges])),
            acid_interaction=_fixed(np.array([self._interaction(name) for name in names])),
            solids=tuple(row.product for row in solid),
            solid_nu=_fixed(solid_nu),
            solid_nu_water=_fixed(solid_nu_water),
            solid_log_beta=_fixed(solid_log_beta),
            gases=tuple(row.product for row in gas),
            gas_nu=_fixed(gas_nu),
            gas_nu_water=_fixed(gas_nu_water),
            gas_log_beta=_fixed(gas_log_beta),
            temperature_C=temperature_C,
            uncorrected=tuple(
                row.product for row in (*aqueous, *solid, *gas) if shifted and row.enthalpy_formation is None
            ),
        )


def reduce_network(
    equilibria: Sequence[Equilibrium],
    species: Mapping[str, Species],
    components: Iterable[str],
    *,
    temperature_C: float = 25.0,
    slow_solids: bool = False,
) -> Network:
    """What can form from ``components`` (and H+, H2O) alone.

    Constants are taken to ``temperature_C`` by van 't Hoff's equation where the enthalpy of formation is known, and
    kept otherwise. Solids whose ``forms`` is "slow" are left out unless ``slow_solids``. Raises KnowledgeError as
    :meth:`NetworkFactory.network`, which is the call to use for more than one network.
    """
    return NetworkFactory(equilibria, species).network(components, temperature_C, slow_solids=slow_solids)


def van_t_hoff(log10_beta: float, enthalpy_kJ: float | None, temperature_C: float) -> float:
    """log10 K at a temperature from its value at 25 degC and a constant enthalpy of reaction (kJ/mol)."""
    if enthalpy_kJ is None:
        return log10_beta
    inverse = 1.0 / (temperature_C + ZERO_CELSIUS) - 1.0 / REFERENCE_KELVIN
    return float(log10_beta - enthalpy_kJ / (GAS_CONSTANT_KJ * np.log(10.0)) * inverse)


def _arrays(
    rows: Sequence[Equilibrium], tokens: tuple[str, ...], temperature_C: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    column = {token: number for number, token in enumerate(tokens)}
    nu = np.zeros((len(rows), len(tokens)))
    nu_water = np.zeros(len(rows))
    log_beta = np.zeros(len(rows))
    for number, row in enumerate(rows):
        log_beta[number] = van_t_hoff(row.log10_beta, row.enthalpy_formation, temperature_C)
        for token, coefficient in row.coefficients.items():
            if token == "H2O":
                nu_water[number] = coefficient
            else:
                nu[number, column[token]] = coefficient
    return nu, nu_water, log_beta


def _fixed(array: FloatArray) -> FloatArray:
    array.setflags(write=False)
    return array
