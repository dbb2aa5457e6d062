"""What the variables of a rule can stand for in a vessel, and in which lanes its conditions hold."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from itertools import product

import numpy as np
from numpy.typing import NDArray

from carboy.chemistry.mixture import TRACE, Array, Mixture
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.model.rule import Bound, Condition, Earlier, Measured, Meeting, Present, Rule, Vessel

Mask = NDArray[np.bool_]


@dataclass(frozen=True)
class Carrier:
    """Something in the vessel that a variable can be bound to: a dissolved family, a species, a solid, a liquid, or a labelled substance."""

    token: str
    where: str  # "dissolved", "solid", "liquid", "gas"
    classes: frozenset[str]
    amount: Array = field(repr=False, compare=False)
    labelled: bool = False


@dataclass(frozen=True)
class Surroundings:
    """What the rules may ask of the vessel besides its content."""

    cover: str = "open"
    container: str = "glass"
    container_words: frozenset[str] = frozenset({"glass"})
    pours: Mapping[str, frozenset[int]] = field(
        default_factory=dict
    )  # token or substance id -> numbers of the pours that brought it
    pouring: int | None = None  # the pour that is being added now
    earlier: Mapping[str, frozenset[str]] = field(default_factory=dict)  # token -> classes, for what was here before


Binding = dict[str, Carrier]


class View:
    """One mixture as the rules see it; everything is computed once."""

    def __init__(self, mixture: Mixture, surroundings: Surroundings) -> None:
        self.mixture = mixture
        self.surroundings = surroundings
        self.stock: ChemicalStock = mixture.stock
        self.carriers = tuple(self._carriers())
        self._by_class: dict[str, list[Carrier]] = {}
        self._bindings: dict[str, list[Binding]] = {}  # by rule id
        for carrier in self.carriers:
            for key in (carrier.token, *carrier.classes):
                self._by_class.setdefault(key, []).append(carrier)
        self.keys = frozenset(self._by_class)  # every token and class that is there

    def _carriers(self) -> Iterator[Carrier]:
        mixture, classes = self.mixture, self.stock.classes
        for token in mixture.amounts:
            if token in (PROTON, WATER):
                continue
            if self.stock.kind(token) == "aside":
                amount = mixture.total(token)
                phase = self.stock.species(token).phase
                where = {"s": "solid", "l": "liquid", "g": "gas"}.get(phase, "dissolved")
            else:
                amount, where = mixture.dissolved(token), "dissolved"
            if np.any(amount > TRACE):
                yield Carrier(token, where, classes.get(token, frozenset()), amount)
        for token, amount in mixture.aqueous.items():
            if token not in mixture.amounts and classes.get(token) and np.any(amount > TRACE):
                yield Carrier(token, "dissolved", classes[token], amount)
        for token, amount in mixture.solids.items():
            yield Carrier(token, "solid", classes.get(token, frozenset()), amount)
        for name in mixture.labelled:
            substance = self.stock.index.substances[name]
            if set(substance.yields) - {name} and classes.get(name):
                amount = mixture.remaining(name)
                if np.any(amount > TRACE):
                    yield Carrier(name, "dissolved", classes[name], amount, labelled=True)

    def having(self, keys: tuple[str, ...], but_not: tuple[str, ...] = (), where: str = "any") -> list[Carrier]:
        """The carriers of any of the classes (or of the token itself) and of none of ``but_not``, in the phase asked for."""
        found: dict[tuple[str, str], Carrier] = {}
        for key in keys:
            for carrier in self._by_class.get(key, ()):
                if carrier.classes.intersection(but_not) or carrier.token in but_not:
                    continue
                if where not in ("any", "reachable", carrier.where):
                    continue
                found[carrier.token, carrier.where] = carrier
        return list(found.values())

    def bindings(self, rule: Rule) -> list[Binding]:
        """Every way to bind the variables of the ``needs`` of a rule, one thing never under two names."""
        known = self._bindings.get(rule.id)
        if known is None:
            known = self._bindings[rule.id] = list(self._bound(rule)) if self._possible(rule) else []
        return known

    def _bound(self, rule: Rule) -> Iterator[Binding]:
        asked = [condition for condition in rule.needs if isinstance(condition, Bound)]
        choices = [self.having(one.classes, one.but_not, one.where) for one in asked]
        if not all(choices):
            return
        for picked in product(*choices):
            if len({carrier.token for carrier in picked}) == len(picked):
                yield {one.variable: carrier for one, carrier in zip(asked, picked, strict=True)}

    def _possible(self, rule: Rule) -> bool:
        """Whether the things and the vessel that a rule needs are there at all, before any figure is looked at."""
        for one in rule.needs:
            if isinstance(one, Present) and not one.negated and one.term not in self._by_class:
                formed = one.term in self.stock.index.species and self.stock.kind(one.term) in (
                    "aqueous",
                    "gas",
                    "water",
                )
                if not formed or not (self.mixture.amount_of(one.term) > TRACE).any():
                    return False
            elif isinstance(one, Vessel | Earlier) and not self.holds(one, {}).any():
                return False
        return True

    def amount(self, term: str, binding: Binding) -> Array:
        """mol of a variable's carrier, a species, a substance, or everything of a class."""
        if term in binding:
            return binding[term].amount
        if term in self.stock.index.species or term in self.stock.index.substances or term == WATER:
            return self.mixture.amount_of(term)
        total = self.mixture.zeros()
        for carrier in self._by_class.get(term, ()):
            if not carrier.labelled:
                total = total + carrier.amount
        return total

    def holds(self, condition: Condition, binding: Binding) -> Mask:
        """Lanes in which a condition is met, ``[L]``."""
        mixture = self.mixture
        everywhere = np.ones(mixture.lanes, dtype=bool)
        match condition:
            case Bound(variable=variable):
                carrier = binding[variable]
                fits = carrier in self.having(condition.classes, condition.but_not, condition.where)
                return carrier.amount > TRACE if fits else ~everywhere
            case Present(term=term, negated=negated, where=where):
                if term in self.stock.index.species and self.stock.kind(term) in ("aqueous", "gas", "water"):
                    there = mixture.amount_of(term) > TRACE
                else:
                    there = ~everywhere
                    for carrier in self.having((term,), where=where):
                        there = there | (carrier.amount > TRACE)
                return ~there if negated else there
            case Vessel(about=about, words=words, negated=negated):
                mine = {self.surroundings.cover} if about == "cover" else self.surroundings.container_words
                met = bool(mine.intersection(words))
                return everywhere if met != negated else ~everywhere
            case Earlier(classes=classes):
                met = any(
                    known.intersection(classes) or token in classes
                    for token, known in self.surroundings.earlier.items()
                )
                return everywhere if met else ~everywhere
            case Meeting(first=first, second=second):
                return everywhere if self._meets(first, second, binding) else ~everywhere
            case Measured():
                return self._measured(condition, binding)
        raise AssertionError(condition)

    def _pours_of(self, term: str, binding: Binding) -> frozenset[int]:
        token = binding[term].token if term in binding else term
        mine = self.surroundings.pours.get(token)
        if mine is not None:
            return mine
        if token not in self.stock.index.species and token not in self.stock.index.substances:
            return frozenset()
        parts = [
            self.surroundings.pours.get(piece, frozenset())
            for piece in self.stock.components_of(token)
            if piece not in (PROTON, WATER)
        ]
        return frozenset().union(*parts) if parts else frozenset()

    def _meets(self, first: str, second: str, binding: Binding) -> bool:
        now = self.surroundings.pouring
        one, other = self._pours_of(first, binding), self._pours_of(second, binding)
        if now is None:
            return bool(one and other)
        return bool((now in one and other - {now}) or (now in other and one - {now}))

    def _measured(self, condition: Measured, binding: Binding) -> Mask:
        value = self.measure(condition, binding)
        with np.errstate(invalid="ignore"):
            match condition.compare:
                case "above":
                    return value > condition.low
                case "at least":
                    return value >= condition.low
                case "below":
                    return value < condition.high
                case "at most":
                    return value <= condition.high
                case "between":
                    return (value >= condition.low) & (value <= condition.high)

    def measure(self, condition: Measured, binding: Binding) -> Array:
        """The number that a condition asks for, ``[L]``, in the unit that :class:`Measured` fixes."""
        mixture = self.mixture
        match condition.quantity:
            case "pH":
                return mixture.pH
            case "temperature":
                return mixture.temperature_C
            case "water fraction":
                return mixture.water_fraction
            case "ionic strength":
                return mixture.zeros() if mixture.solved is None else mixture.solved.ionic_strength
            case "headspace":
                return np.full(mixture.lanes, np.inf) if mixture.headspace_L is None else mixture.headspace_L
            case "property":
                return np.full(mixture.lanes, self._property(condition.term, condition.other, binding))
        amount = self.amount(condition.term, binding)
        match condition.quantity:
            case "amount":
                return amount
            case "strength":
                return np.divide(amount, mixture.volume_L, out=mixture.zeros(), where=mixture.volume_L > 0)
            case "mass" | "mass fraction":
                grams = amount * self._molar_mass(condition.term, binding)
                if condition.quantity == "mass":
                    return grams
                return np.divide(grams, mixture.mass_g, out=mixture.zeros(), where=mixture.mass_g > 0)
            case "ratio":
                below = self.amount(condition.other, binding)
                return np.divide(amount, below, out=np.where(amount > 0, np.inf, 0.0), where=below > 0)
        raise AssertionError(condition.quantity)

    def _molar_mass(self, term: str, binding: Binding) -> float:
        token = binding[term].token if term in binding else term
        if token in self.stock.index.species or token in self.stock.index.substances:
            return self.stock.molar_mass(token)
        members = [carrier for carrier in self._by_class.get(term, ()) if not carrier.labelled]
        return self.stock.molar_mass(members[0].token) if members else 0.0

    def _property(self, term: str, name: str, binding: Binding) -> float:
        token = binding[term].token if term in binding else term
        record = self.stock.index.species.get(token) or self.stock.index.substances[token]
        if name == "carbons":
            return record.atoms.get("C", 0.0)
        charge = float(getattr(record, "charge", 0))
        if name == "charge":
            return charge
        key = getattr(record, "report_key", "")
        if "(" in key:
            return float(_ROMAN.get(key[key.index("(") + 1 : -1].lstrip("-"), 0)) * (-1.0 if "(-" in key else 1.0)
        return charge


_ROMAN = {"0": 0, "I": 1, "II": 2, "III": 3, "IV": 4, "V": 5, "VI": 6, "VII": 7, "VIII": 8}
