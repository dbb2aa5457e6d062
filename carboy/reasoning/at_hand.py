"""Which rules have what they need in a vessel, found by names and classes alone, before any figure is looked at."""

from __future__ import annotations

from msgspec import Struct

from carboy.chemistry.stock import ChemicalStock
from carboy.model.rule import Bound, Present, Rule
from carboy.reasoning.binding import View

_FORMED = ("aqueous", "gas", "water")  # a figure of the state tells whether it is there, no name in the vessel


class _Wants(Struct, frozen=True):
    rule: Rule
    choices: tuple[frozenset[str], ...]  # tokens and classes: one of each choice must be there


class RulesAtHand:
    """A body of rules, and those of them that a vessel's content can set going at all."""

    def __init__(self, rules: tuple[Rule, ...], stock: ChemicalStock) -> None:
        self.rules = rules
        self._wants = tuple(_Wants(rule, _choices(rule, stock)) for rule in rules)
        self._known: dict[frozenset[str], tuple[Rule, ...]] = {}

    def of(self, *views: View) -> tuple[Rule, ...]:
        """The rules, in their order, that at least one of the views has the things for."""
        keys = frozenset(view.keys for view in views)
        if len(keys) == 1:
            return self._of(*keys)
        able = {rule.id for one in keys for rule in self._of(one)}
        return tuple(rule for rule in self.rules if rule.id in able)

    def _of(self, keys: frozenset[str]) -> tuple[Rule, ...]:
        known = self._known.get(keys)
        if known is None:
            known = self._known[keys] = tuple(
                one.rule for one in self._wants if not any(choice.isdisjoint(keys) for choice in one.choices)
            )
        return known


def _choices(rule: Rule, stock: ChemicalStock) -> tuple[frozenset[str], ...]:
    choices = [frozenset(one.classes) for one in rule.needs if isinstance(one, Bound)]
    for one in rule.needs:
        if isinstance(one, Present) and not one.negated:
            if one.term in stock.index.species and stock.kind(one.term) in _FORMED:
                continue
            choices.append(frozenset((one.term,)))
    return tuple(choices)
