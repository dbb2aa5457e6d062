"""Mass action and balances of many lanes at once: the arrays on which the solver works.

A lane is one vessel of its own. Everything is held per kilogram of the water that the lane began with, so that a drop
and a drum are the same problem. In a sealed vessel the gases in the headspace (``p V / R T`` mol) are carried as
further terms beside the aqueous species.
"""

from __future__ import annotations

from functools import cache
from typing import Self

import numpy as np
from msgspec import Struct
from msgspec.structs import replace
from numpy.typing import NDArray

from carboy.chemistry import activity
from carboy.chemistry.gases import GAS_CONSTANT, water_vapour_pressure
from carboy.chemistry.network import ZERO_CELSIUS, FloatArray, Network

BoolArray = NDArray[np.bool_]
IntArray = NDArray[np.intp]

LN10 = float(np.log(10.0))
KG_PER_MOL_WATER = 0.01801528
MOST_SOLUTE = 50.0  # mol of components per kg of water; below that much water the floor holds
LEAST_WATER = 1e-9  # kg
LEAST_GAS_SHARE = 0.02  # of ambient pressure that is left to gases when the water itself nears boiling
ABSENT = -1e5  # ln of what is not there
_CEILING = 60.0  # ln of the largest molality that is evaluated


class Terms(Struct, frozen=True, eq=False):
    """What all lanes share: J terms (aqueous species, then headspace gases) and M solids over C columns, one for each
    component or for several that never meet.
    """

    nu: FloatArray  # [J, C]
    scaling: FloatArray  # [J, 4 C]: gains, losses as positive numbers, and both times the sum of |nu| of the term
    sums: FloatArray  # [J, 2 C + 4]: nu, |nu|, z^2, neutral, water, aqueous
    features: FloatArray  # [J, C + 4]: nu, z^2, neutral, water, aqueous
    nu_across: FloatArray  # [C, J]
    medium_across: FloatArray  # [4, J]: z^2, neutral, water, aqueous
    feature_pairs: FloatArray  # [J, pairs of C + 4]
    nu_pairs: FloatArray  # [J, pairs of C]
    solid_nu: FloatArray  # [M, C]
    solid_water: FloatArray  # [M]
    solid_pairs: FloatArray  # [M, pairs of C]
    gas_nu: FloatArray  # [G, C]
    gas_water: FloatArray  # [G]
    gas_pairs: FloatArray  # [G, pairs of C]
    slope: float  # A of the Davies equation
    sparse: bool  # whether columns are shared, so that most terms are absent from a lane

    @property
    def size(self) -> int:
        return int(self.nu.shape[1])

    @classmethod
    def of(cls, network: Network, sealed: bool) -> Self:
        """Cached on the network."""
        cache = network.__dict__.setdefault("_terms", {})
        if sealed not in cache:
            cache[sealed] = cls.over(network, sealed, np.arange(len(network.components)))
        made: Self = cache[sealed]
        return made

    @classmethod
    def over(cls, network: Network, sealed: bool, column: IntArray) -> Self:
        """With each component in the ``column`` [components] given for it."""
        into = np.zeros((column.size, int(column.max()) + 1))
        into[np.arange(column.size), column] = 1.0
        nu, water, charge = network.nu @ into, network.nu_water, network.charge
        solid_nu, gas_nu = network.solid_nu @ into, network.gas_nu @ into
        aqueous = np.ones(len(network.species))
        neutral = (charge == 0.0).astype(float)
        if sealed:
            none = np.zeros(len(network.gases))
            nu = np.vstack([nu, gas_nu])
            water = np.concatenate([water, network.gas_nu_water])
            charge, aqueous, neutral = (np.concatenate([part, none]) for part in (charge, aqueous, neutral))
        features = np.column_stack([nu, charge**2, neutral, water, aqueous])
        positive, negative = np.maximum(nu, 0.0), np.maximum(-nu, 0.0)
        total = np.abs(nu).sum(axis=1, keepdims=True)
        weighted = positive * total, negative * total
        return cls(
            nu=nu,
            scaling=np.hstack([positive, negative, *weighted]),
            sums=np.hstack([nu, np.abs(nu), features[:, nu.shape[1] :]]),
            features=features,
            nu_across=np.ascontiguousarray(nu.T),
            medium_across=np.ascontiguousarray(features[:, nu.shape[1] :].T),
            feature_pairs=pairs_of(features),
            nu_pairs=pairs_of(nu),
            solid_nu=solid_nu,
            solid_water=network.solid_nu_water,
            solid_pairs=pairs_of(solid_nu),
            gas_nu=gas_nu,
            gas_water=network.gas_nu_water,
            gas_pairs=pairs_of(gas_nu),
            slope=activity.debye_hueckel_slope(network.temperature_C),
            sparse=into.shape[0] > into.shape[1],
        )


class Lanes(Struct, eq=False):
    """What differs from lane to lane and does not change while solving. K = M + 1: the solids and the gas phase of
    bubbles.
    """

    number: IntArray  # [L] lane of the caller
    totals: FloatArray  # [L, C] mol per kg
    water: FloatArray  # [L] mol H2O per kg of starting water
    least_water: FloatArray  # [L] kg per kg
    absent: BoolArray  # [L, C]
    hundredth: FloatArray  # [L] of all components but H+, mol per kg
    ln_beta: FloatArray  # [L, J]
    solid_ln_beta: FloatArray  # [L, M]
    gas_ln_beta: FloatArray  # [L, G]
    ln_available: FloatArray  # [L] ln of the pressure (atm) that gases must reach to bubble
    allowed: BoolArray  # [L, K] phases that can exist at all
    most: FloatArray  # [L, K] the most that could form of each phase, mol per kg; 1 where it cannot

    def take(self, which: IntArray | BoolArray) -> Lanes:
        """These lanes only."""
        return Lanes(**{name: getattr(self, name)[which] for name in self.__struct_fields__})

    def in_columns(self, column: IntArray) -> Lanes:
        """With each component in the ``column`` [components] given for it; those of one column are not in one lane."""
        shape = (self.number.size, int(column.max()) + 1)
        totals, absent = np.zeros(shape), np.ones(shape, dtype=bool)
        for component, place in enumerate(column):
            totals[:, place] += np.where(self.absent[:, component], 0.0, self.totals[:, component])
            absent[:, place] &= self.absent[:, component]
        return replace(self, totals=totals, absent=absent)


class State(Struct, eq=False):
    """Where the iteration stands."""

    x: FloatArray  # [L, C] ln activity of the components
    phases: FloatArray  # [L, K] mol of each solid and of the bubbled gas, per kg of starting water
    strength: FloatArray  # [L] ionic strength, mol/kg
    molality: FloatArray  # [L] sum of molalities, mol/kg
    ln_water: FloatArray  # [L] ln of kg water per kg of starting water

    def take(self, which: IntArray | BoolArray) -> State:
        """A copy of these lanes."""
        return State(**{name: getattr(self, name)[which].copy() for name in self.__struct_fields__})

    def put(self, which: IntArray | BoolArray, other: State) -> None:
        """Write ``other`` into these lanes."""
        for name in self.__struct_fields__:
            getattr(self, name)[which] = getattr(other, name)

    def copy(self) -> State:
        """A copy."""
        return replace(self, **{name: getattr(self, name).copy() for name in self.__struct_fields__})


class Vessel(Struct, frozen=True, eq=False):
    """What stands over the liquid."""

    headspace_L: FloatArray | None  # [L]; None is open
    ambient_atm: float
    retain_gas: bool  # no gas phase at all


def make_lanes(network: Network, totals: FloatArray, water_mol: FloatArray, vessel: Vessel) -> tuple[Lanes, FloatArray]:
    """The lanes, and the kg of water by which each was divided, [L]."""
    lanes = totals.shape[0]
    solute = totals[:, 1:].sum(axis=1)
    floor_kg = np.maximum(solute / MOST_SOLUTE, LEAST_WATER)
    scale = np.maximum(water_mol * KG_PER_MOL_WATER, floor_kg)
    scaled = totals / scale[:, None]
    # A component of zero total is absent, unless something made from it could give it back (a negative coefficient).
    rows = np.vstack([network.nu, network.solid_nu, network.gas_nu])
    keep: BoolArray = np.asarray((rows < 0.0).any(axis=0))
    keep[0] = True
    absent = (totals == 0.0) & ~keep
    gone = absent.astype(float)
    missing = gone @ (network.nu != 0.0).T.astype(float) > 0.0
    solid_missing = gone @ (network.solid_nu != 0.0).T.astype(float) > 0.0
    gas_missing = gone @ (network.gas_nu != 0.0).T.astype(float) > 0.0
    ln_beta = np.where(missing, ABSENT, LN10 * network.log_beta)
    gas_ln_beta = np.where(gas_missing, ABSENT, LN10 * network.gas_log_beta)
    if vessel.headspace_L is not None:
        kelvin = network.temperature_C + ZERO_CELSIUS
        per_atm = np.log(np.maximum(vessel.headspace_L, 1e-30) / (GAS_CONSTANT * kelvin) / scale)
        ln_beta = np.concatenate([ln_beta, gas_ln_beta + per_atm[:, None]], axis=1)
    open_gas = vessel.headspace_L is None and not vessel.retain_gas and len(network.gases) > 0
    bubbles = (~gas_missing).any(axis=1) & open_gas
    most_solid = _most(network.solid_nu, scaled)
    most_gas = np.where(gas_missing, 0.0, _most(network.gas_nu, scaled)).sum(axis=1)
    allowed = np.column_stack([~solid_missing, bubbles])
    most = np.where(allowed, np.column_stack([most_solid, most_gas]), 1.0)
    vapour = water_vapour_pressure(network.temperature_C)
    available = max(vessel.ambient_atm - vapour, LEAST_GAS_SHARE * vessel.ambient_atm)
    return (
        Lanes(
            number=np.arange(lanes),
            totals=scaled,
            water=water_mol / scale,
            least_water=floor_kg / scale,
            absent=absent,
            hundredth=0.01 * scaled[:, 1:].sum(axis=1),
            ln_beta=ln_beta,
            solid_ln_beta=np.where(solid_missing, ABSENT, LN10 * network.solid_log_beta),
            gas_ln_beta=gas_ln_beta,
            ln_available=np.full(lanes, np.log(available)),
            allowed=allowed,
            most=np.maximum(most, 1e-30),
        ),
        scale,
    )


def _most(nu: FloatArray, totals: FloatArray) -> FloatArray:
    """[L, rows]: total over coefficient of the scarcest component other than H+."""
    shares = np.full((totals.shape[0], nu.shape[0]), np.inf)
    for component in range(1, nu.shape[1]):
        rows = np.flatnonzero(nu[:, component] > 0.0)
        if rows.size:
            shares[:, rows] = np.minimum(shares[:, rows], totals[:, component, None] / nu[rows, component])
    return np.where(np.isfinite(shares), shares, 1.0)


def matrix_vector(matrix: FloatArray, vector: FloatArray) -> FloatArray:
    """Product of each lane's matrix [L, A, B] and vector [L, B]: [L, A]."""
    return np.asarray((matrix @ vector[:, :, None])[:, :, 0])


def vector_matrix(vector: FloatArray, matrix: FloatArray) -> FloatArray:
    """Product of each lane's vector [L, A] and matrix [L, A, B]: [L, B]."""
    return np.asarray((vector[:, None, :] @ matrix)[:, 0, :])


def diagonal_of(matrices: FloatArray) -> FloatArray:
    """A view of the diagonals of [L, A, A], [L, A]; what is written to it is written to them. They must be contiguous."""
    size = matrices.shape[1]
    return matrices.reshape(matrices.shape[0], size * size)[:, :: size + 1]


def pairs_of(rows: FloatArray) -> FloatArray:
    """Products of the columns of ``rows`` [R, A] two by two, each pair once: [R, A (A + 1) / 2]. Weighted and summed they are a
    symmetric matrix, see :func:`square`."""
    one, other = np.triu_indices(rows.shape[1])
    return np.ascontiguousarray(rows[:, one] * rows[:, other])


@cache
def _places(size: int) -> IntArray:
    """Where the entries of a symmetric matrix of ``size`` stand among its pairs, row by row."""
    places = np.zeros((size, size), dtype=np.intp)
    one, other = np.triu_indices(size)
    places[one, other] = places[other, one] = np.arange(one.size)
    return places.ravel()


def square(pairs: FloatArray, size: int) -> FloatArray:
    """The symmetric matrices [L, size, size] of sums of pairs [L, size (size + 1) / 2]."""
    return np.take(pairs, _places(size), axis=1).reshape(-1, size, size)


class Medium(Struct, eq=False):
    """Activity corrections of each lane at its ionic strength and sum of molalities; all [L]."""

    ion: FloatArray
    ion_slope: FloatArray
    neutral: FloatArray
    neutral_slope: FloatArray
    water: FloatArray
    water_slope: FloatArray

    @classmethod
    def at(cls, terms: Terms, strength: FloatArray, molality: FloatArray) -> Self:
        """Evaluated."""
        return cls(
            *activity.ln_gamma_unit_charge(strength, terms.slope),
            *activity.ln_gamma_neutral(strength),
            *activity.ln_water_activity(molality),
        )

    def take(self, which: BoolArray) -> Medium:
        """These lanes only."""
        return Medium(**{name: getattr(self, name)[which] for name in self.__struct_fields__})


def ln_constants(terms: Terms, lanes: Lanes, state: State, medium: Medium) -> FloatArray:
    """ln of what each term would be with all components at unit activity, [L, J]."""
    given = np.empty((lanes.number.size, 4))
    given[:, 0] = -medium.ion
    given[:, 1] = -medium.neutral
    given[:, 2] = medium.water
    given[:, 3] = state.ln_water
    return given @ terms.medium_across + lanes.ln_beta


def amounts_of(terms: Terms, state: State, constants: FloatArray) -> FloatArray:
    """mol of each term per kg of starting water, [L, J], from :func:`ln_constants`."""
    logs = state.x @ terms.nu_across
    logs += constants
    np.minimum(logs, _CEILING, out=logs)
    if terms.sparse:  # exponentials are the dearer the further they underflow
        return np.exp(logs, out=np.zeros(logs.shape), where=constants > 0.5 * ABSENT)
    return np.exp(logs, out=logs)


def term_amounts(terms: Terms, lanes: Lanes, state: State, medium: Medium) -> FloatArray:
    """mol of each term per kg of starting water, [L, J]."""
    return amounts_of(terms, state, ln_constants(terms, lanes, state, medium))


def ln_pressures(terms: Terms, lanes: Lanes, state: State, medium: Medium) -> FloatArray:
    """ln of the partial pressures (atm) in equilibrium with the liquid, [L, G]."""
    return lanes.gas_ln_beta + state.x @ terms.gas_nu.T + medium.water[:, None] * terms.gas_water


def ln_saturation(terms: Terms, lanes: Lanes, state: State, medium: Medium) -> FloatArray:
    """ln of the saturation ratio of the solids, [L, M]."""
    return lanes.solid_ln_beta + state.x @ terms.solid_nu.T + medium.water[:, None] * terms.solid_water


class Constraints(Struct, eq=False):
    """The phases' conditions: ``excess <= 0``; their gradients by x are the solids' coefficients and ``gas_row``."""

    excess: FloatArray  # [L, K] ln of saturation ratio, and of sum(p) over the available pressure
    gas_row: FloatArray  # [L, C] mean coefficients of the bubbled gas
    gas_water: FloatArray  # [L] its H2O
    shares: FloatArray  # [L, G] its composition
    any_gas: bool

    @classmethod
    def at(cls, terms: Terms, lanes: Lanes, state: State, medium: Medium) -> Self:
        """Evaluated; phases that cannot exist have an excess of -1."""
        count, solids = lanes.number.size, terms.solid_nu.shape[0]
        excess = np.empty((count, solids + 1))
        excess[:, :solids] = ln_saturation(terms, lanes, state, medium)
        bubbles = lanes.allowed[:, solids]
        any_gas = bool(bubbles.any())
        if any_gas:
            pressures = ln_pressures(terms, lanes, state, medium)
            top = pressures.max(axis=1)
            shares = np.exp(pressures - top[:, None])
            sums = shares.sum(axis=1)
            shares *= (bubbles / sums)[:, None]
            excess[:, solids] = top + np.log(sums) - lanes.ln_available
        else:
            shares = np.zeros((count, terms.gas_nu.shape[0]))
        excess[~lanes.allowed] = -1.0
        return cls(excess, shares @ terms.gas_nu, shares @ terms.gas_water, shares, any_gas)

    def take(self, which: BoolArray) -> Constraints:
        """These lanes only."""
        return Constraints(
            self.excess[which], self.gas_row[which], self.gas_water[which], self.shares[which], self.any_gas
        )

    def sum_over(self, terms: Terms, weights: FloatArray) -> FloatArray:
        """Gradients summed with ``weights`` [L, K] (zero for phases that cannot exist): [L, C]."""
        total = weights[:, :-1] @ terms.solid_nu
        if self.any_gas:
            total += weights[:, -1:] * self.gas_row
        return total

    def along(self, terms: Terms, lanes: Lanes, step: FloatArray) -> FloatArray:
        """Change of each excess with a step of x [L, C]: [L, K]."""
        change = np.empty(self.excess.shape)
        change[:, :-1] = step @ terms.solid_nu.T
        change[:, -1] = (step * self.gas_row).sum(axis=1)
        change[~lanes.allowed] = 0.0
        return change

    def water_in(self, terms: Terms, phases: FloatArray) -> FloatArray:
        """mol H2O in the phases, [L]."""
        return np.asarray(phases[:, :-1] @ terms.solid_water + phases[:, -1] * self.gas_water)
