"""Equilibria as their sources print them, brought to one form: each product from components."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from typing import Literal

from msgspec import Struct

from carboy.model.knowledge import Equilibrium, Index, Value
from carboy.text.formulas import Equation


class PrintedEquilibrium(Struct, frozen=True):
    """An equilibrium as written in kb/: ``product`` stands in ``equation`` once, on either side."""

    product: str
    kind: Literal["aqueous", "solid", "gas"]
    equation: Equation
    log10_k: Value
    enthalpy: Value | None = None


class NotReducibleError(Exception):
    """A formation cannot be brought to components; the text says why."""


def reduce_to_components(
    printed: Iterable[PrintedEquilibrium], components: Collection[str]
) -> tuple[dict[str, Equilibrium], dict[str, str]]:
    """Substitute every species that is no component by its own formation: (product -> equilibrium, product -> why not).

    From ``log10 K = sum(nu_i log10 a_i)`` follows the product's activity; a solid or gas among the reactants is
    substituted like a dissolved species, because its activity obeys its own equilibrium. Enthalpies add in the same
    way and are None as soon as one link has none.
    """
    by_product = {item.product: item for item in printed}
    done: dict[str, Equilibrium] = {}
    faults: dict[str, str] = {}

    def reduce(product: str, trail: tuple[str, ...]) -> Equilibrium:
        if product in done:
            return done[product]
        if product in faults:
            raise NotReducibleError(f"it needs {product}, which cannot be reduced to components itself")
        if product in trail:
            raise NotReducibleError(
                "its reactions go in a circle: " + " <- ".join((*trail[trail.index(product) :], product))
            )
        item = by_product[product]
        net = item.equation.net
        side = net.get(product, 0.0)
        if abs(side) != 1:
            raise NotReducibleError(f"{product} must stand in its reaction once, with coefficient 1")
        coefficients: dict[str, float] = {}
        log10_beta = side * item.log10_k.magnitude
        enthalpy = None if item.enthalpy is None else side * item.enthalpy.magnitude
        for token, value in net.items():
            if token == product:
                continue
            share = -side * value
            if token in components:
                coefficients[token] = coefficients.get(token, 0.0) + share
                continue
            if token not in by_product:
                raise NotReducibleError(f"{token} is neither a component nor formed by an equilibrium")
            link = reduce(token, (*trail, product))
            log10_beta += share * link.log10_beta
            enthalpy = (
                None
                if enthalpy is None or link.enthalpy_formation is None
                else enthalpy + share * link.enthalpy_formation
            )
            for component, count in link.coefficients.items():
                coefficients[component] = coefficients.get(component, 0.0) + share * count
        done[product] = Equilibrium(
            product=product,
            kind=item.kind,
            coefficients={token: value for token, value in coefficients.items() if abs(value) > 1e-9},
            log10_beta=log10_beta,
            reaction=item.equation.text,
            printed=item.log10_k,
            enthalpy=item.enthalpy,
            enthalpy_formation=enthalpy,
        )
        return done[product]

    for product in by_product:
        try:
            reduce(product, ())
        except NotReducibleError as reason:
            faults[product] = str(reason)
    return {product: done[product] for product in by_product if product in done}, faults


def components_of(amounts: Mapping[str, float], index: Index) -> dict[str, float]:
    """Amounts of species (mol) -> amounts of components (mol; of H+ and H2O they may be negative): ``OH-`` is ``H2O -
    H+``.

    Raises KeyError for a token that is neither a component nor formed by an equilibrium.
    """
    formation = {item.product: item for item in index.equilibria}
    total: dict[str, float] = {}
    for token, amount in amounts.items():
        if index.species[token].component:
            total[token] = total.get(token, 0.0) + amount
            continue
        for component, count in formation[token].coefficients.items():
            total[component] = total.get(component, 0.0) + amount * count
    return {token: value for token, value in total.items() if value != 0}
