"""What the terms of a rule can stand for in the knowledge graph: members of classes, make-up, parts, gases."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from itertools import product

from carboy.chemistry.balance import Formula
from carboy.chemistry.relations import part_of
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.model.knowledge import Index
from carboy.model.rule import Bound, Rule, Where

_PHASE = {"dissolved": "aq", "solid": "s", "liquid": "l", "gas": "g"}


class Composition:
    """Look-ups over an index, as the checks of the rule book need them."""

    def __init__(self, index: Index) -> None:
        self.index = index
        self._stock = ChemicalStock(index)

    def is_token(self, term: str) -> bool:
        """Whether ``term`` is a species or a substance of the graph."""
        return term in (WATER, PROTON) or term in self.index.species or term in self.index.substances

    def formula(self, token: str) -> Formula:
        """Atoms and charge of a species or substance; KeyError if unknown."""
        record = self.index.species.get(token)
        if record is not None:
            return record.atoms, record.charge
        if token == WATER:
            return {"H": 2.0, "O": 1.0}, 0
        if token == PROTON:
            return {"H": 1.0}, 1
        return self.index.substances[token].atoms, 0

    def components(self, token: str) -> dict[str, float]:
        """mol of each component in one mol of a species or substance; KeyError if unknown."""
        return self._stock.components_of(token)

    def above(self, token: str) -> frozenset[str]:
        """The classes of a species or substance and all classes above them."""
        return self._stock.classes.get(token, frozenset())

    def members(self, keys: Iterable[str], but_not: Iterable[str] = (), where: Where = "any") -> tuple[str, ...]:
        """Species, and substances known only by what they give in water, that a condition can bind, sorted."""
        asked, excluded = frozenset(keys), frozenset(but_not)
        found = []
        for token in (*self.index.species, *self.index.substances):
            groups = self.above(token) | {token}
            if token in (WATER, PROTON) or not groups & asked or groups & excluded:
                continue
            record = self.index.species.get(token)
            if record is None:
                yields = self.index.substances[token].yields
                if not yields:
                    continue  # in a vessel it is there as the species of its name, which the graph then lacks
                if any((self.above(species) | {species}) & asked for species in yields):
                    continue  # it is bound as the species that it gives
            phase = "aq" if record is None else record.phase
            if where in _PHASE and phase != _PHASE[where]:
                continue
            found.append(token)
        return tuple(sorted(set(found)))

    def choices(self, rule: Rule) -> dict[str, tuple[str, ...]]:
        """Variable -> what the ``needs`` of a rule let it stand for."""
        found: dict[str, tuple[str, ...]] = {}
        for one in rule.needs:
            if isinstance(one, Bound):
                mine = self.members(one.classes, one.but_not, one.where)
                found[one.variable] = tuple(token for token in found.get(one.variable, mine) if token in mine)
        return found

    def bindings(self, choices: dict[str, tuple[str, ...]], variables: Iterable[str]) -> Iterator[dict[str, str]]:
        """Every way to bind ``variables``, one thing never under two names."""
        names = sorted(set(variables))
        for picked in product(*(choices.get(name, ()) for name in names)):
            if len(set(picked)) == len(picked):
                yield dict(zip(names, picked, strict=True))

    def part(self, token: str, part: str) -> str | None:
        """The species that stands in a relation to ``token``; None if the graph does not say. See :func:`part_of`."""
        return part_of(token, part, self._stock)

    def gas(self, token: str) -> str | None:
        """The gas that a species or substance is in the air: ``H2S`` is ``H2S(g)``; None if the graph has none."""
        for name in (token, f"{token}(g)"):
            record = self.index.species.get(name)
            if name in self.index.gases or (record is not None and record.phase == "g"):
                return name
        return None
