"""The graph's chemistry in the form that a vessel needs: how each species is made of components, and which gas is which molecule."""

from __future__ import annotations

from functools import cached_property
from typing import Literal

from carboy.chemistry.network import NetworkFactory
from carboy.chemistry.solved_states import SolvedStates
from carboy.model.knowledge import Equilibrium, Index, Species
from carboy.text.formulas import molar_mass

WATER = "H2O"
PROTON = "H+"

SpeciesKind = Literal["component", "aqueous", "solid", "gas", "aside", "water"]


class ChemicalStock:
    """Look-ups over an :class:`Index` that the chemistry uses again and again.

    A species is a *component* (a building block in water), an *aqueous*, *solid* or *gas* species formed from components by an
    equilibrium, or stands *aside*: a metal, an insoluble solid, an organic liquid, which no equilibrium touches.
    """

    def __init__(self, index: Index) -> None:
        self.index = index
        self.networks = NetworkFactory(index.equilibria, index.species)
        self.solved_states = SolvedStates()
        self.formation: dict[str, Equilibrium] = {item.product: item for item in index.equilibria}

    @cached_property
    def classes(self) -> dict[str, frozenset[str]]:
        """Species token or substance id -> its classes and all above them."""
        closed: dict[str, frozenset[str]] = {}
        stated = [(token, record.classes) for token, record in self.index.substances.items()]
        stated += [(token, record.classes) for token, record in self.index.species.items()]
        for token, classes in stated:
            above = {up for key in classes for up in self.index.ancestors.get(key, (key,))}
            closed[token] = closed.get(token, frozenset()) | above
        return closed

    @cached_property
    def dissolved_form(self) -> dict[str, str]:
        """Gas token -> the molecule in water that it is in equilibrium with, for gases that dissolve as themselves."""
        by_make: dict[tuple[tuple[str, float], ...], str] = {}
        for token, record in self.index.species.items():
            if record.phase == "aq":
                by_make[self._make(token)] = token
        links = {}
        for item in self.index.equilibria:
            if item.kind == "gas":
                molecule = by_make.get(self._make(item.product))
                if molecule is not None:
                    links[item.product] = molecule
        return links

    def carriers(self, molecule: str) -> tuple[str, ...]:
        """A molecule in water and its loose adducts with one anion (Cl2 and Cl3-, HF and HF2-), which give it up at once."""
        known = self._carriers.get(molecule)
        if known is None:
            inner = dict(self._make(molecule))
            makes = (
                (other, dict(self._make(other)))
                for other in self._with_component.get(next(iter(inner)), ())
                if other != molecule
            )
            adducts = [other for other, make in makes if self._adds_an_anion(make, inner)]
            known = self._carriers[molecule] = (molecule, *adducts)
        return known

    @cached_property
    def _carriers(self) -> dict[str, tuple[str, ...]]:
        return {}

    @cached_property
    def _with_component(self) -> dict[str, list[str]]:
        found: dict[str, list[str]] = {}
        for item in self.index.equilibria:
            if item.kind == "aqueous":
                for component in item.coefficients:
                    found.setdefault(component, []).append(item.product)
        return found

    def _adds_an_anion(self, make: dict[str, float], inner: dict[str, float]) -> bool:
        rest = {part: make.get(part, 0.0) - inner.get(part, 0.0) for part in {*make, *inner}}
        over = [(part, count) for part, count in rest.items() if abs(count) > 1e-9]
        return len(over) == 1 and over[0][1] > 0 and over[0][0] != PROTON and self.species(over[0][0]).charge < 0

    def _make(self, token: str) -> tuple[tuple[str, float], ...]:
        return tuple(sorted((key, value) for key, value in self.components_of(token).items() if key != WATER))

    def kind(self, token: str) -> SpeciesKind:
        """What sort of species ``token`` is; KeyError if the graph has none of that name."""
        if token == WATER:
            return "water"
        made = self.formation.get(token)
        if made is not None:
            return made.kind
        record = self.index.species[token]
        return "component" if record.phase == "aq" else "aside"

    def components_of(self, token: str) -> dict[str, float]:
        """mol of each component (``H+`` and ``H2O`` among them, possibly negative) in one mol of ``token``.

        ``token`` is a species or the id of a substance that yields species. KeyError if unknown.
        """
        if token in (WATER, PROTON):
            return {token: 1.0}
        made = self.formation.get(token)
        if made is not None:
            return dict(made.coefficients)
        if token in self.index.species:
            return {token: 1.0}
        return self.yield_of(token)

    def yield_of(self, substance_id: str) -> dict[str, float]:
        """mol of each component that one mol of a substance gives in water."""
        substance = self.index.substances[substance_id]
        if not substance.yields:
            return {substance_id: 1.0}
        total: dict[str, float] = {}
        for token, count in substance.yields.items():
            for component, inner in self.components_of(token).items():
                total[component] = total.get(component, 0.0) + count * inner
        return {token: count for token, count in total.items() if abs(count) > 1e-12}

    def species(self, token: str) -> Species:
        """The record of a species; KeyError if unknown."""
        return self.index.species[token]

    def label(self, token: str) -> str:
        """How a species is written in an equation: the formula of a solid, metal or gas, the name of an organic substance, the token of what
        is dissolved."""
        record = self.index.species.get(token)
        if record is None:
            substance = self.index.substances.get(token)
            return token if substance is None else substance.name if substance.atoms.get("C") else substance.formula
        if record.phase == "aq" or token.endswith("(g)"):
            return token
        return (record.name or token) if record.atoms.get("C") and token in self.index.substances else record.formula

    def molar_mass(self, token: str) -> float:
        """g/mol of a species or substance."""
        record = self.index.species.get(token) or self.index.substances[token]
        return molar_mass(record.atoms)
