"""What the conditions of a rule saw in the vessel, at the one possibility that a finding speaks of."""

from __future__ import annotations

from collections.abc import Sequence

from carboy.bench.trace import Course
from carboy.chemistry.stock import ChemicalStock
from carboy.model.report import Measure, RuleSight
from carboy.model.rule import Bound, Condition, Earlier, Measured, Meeting, Present, Rule, Vessel
from carboy.reasoning.binding import Binding, Surroundings, View
from carboy.text.rule_printer import condition_text

_UNITS = {
    "pH": "1",
    "temperature": "degC",
    "water fraction": "1",
    "ionic strength": "mol/kg",
    "headspace": "L",
    "strength": "mol/L",
    "mass fraction": "1",
    "amount": "mol",
    "mass": "g",
    "ratio": "mol/mol",
    "property": "1",
}


def sights(
    rules: Sequence[Rule],
    bound_by: dict[str, dict[str, str]],
    course: Course,
    surroundings: Surroundings,
    lane: int,
    stock: ChemicalStock,
) -> list[RuleSight]:
    """Each rule with its conditions and the values that these found.

    A rule that changes something is looked at before the change, one that only watches after it; where a condition does not hold there, what
    it needed came or went on the way, and the other view is told.
    """
    views = [View(course.unreacted, surroundings), View(course.mixture, surroundings)]
    found = []
    for rule in rules:
        order = views if rule.does else views[::-1]
        bound = bound_by.get(rule.id, {})
        found.append(RuleSight(rule=rule.id, conditions=[_seen(one, bound, order, lane, stock) for one in rule.needs]))
    return found


def _seen(condition: Condition, bound: dict[str, str], views: list[View], lane: int, stock: ChemicalStock) -> Measure:
    """The measure of a condition in the first view in which it holds, else in the first of all."""
    for view in views:
        binding = _binding(bound, view)
        try:
            met = bool(view.holds(condition, binding)[lane])
        except KeyError:  # what a variable stands for is used up, or not yet made, in this view
            continue
        if met:
            return _measure(condition, binding, view, lane, stock)
    return Measure(quantity=condition_text(condition), value=None, unit="", basis="for a moment, on the way")


def _binding(bound: dict[str, str], view: View) -> Binding:
    binding: Binding = {}
    for variable, token in bound.items():
        carriers = [one for one in view.carriers if one.token == token]
        if carriers:
            binding[variable] = carriers[0]
    return binding


def _measure(condition: Condition, binding: Binding, view: View, lane: int, stock: ChemicalStock) -> Measure:
    text = condition_text(condition)
    match condition:
        case Bound(variable=variable):
            carrier = binding[variable]
            return Measure(
                quantity=text, value=float(carrier.amount[lane]), unit="mol", basis=_named(carrier.token, stock)
            )
        case Present(term=term, negated=negated):
            amount = float(view.amount(term, binding)[lane])
            return Measure(quantity=text, value=amount, unit="mol", basis="" if negated else _named(term, stock))
        case Measured(quantity=quantity):
            value = float(view.measure(condition, binding)[lane])
            return Measure(quantity=text, value=value, unit=_UNITS[quantity], basis="")
        case Vessel(about=about):
            seen = view.surroundings.cover if about == "cover" else view.surroundings.container
            return Measure(quantity=text, value=None, unit=seen, basis="")
        case Earlier(classes=classes):
            known = view.surroundings.earlier
            tokens = [token for token, keys in known.items() if keys.intersection(classes) or token in classes]
            return Measure(quantity=text, value=None, unit=", ".join(_named(one, stock) for one in tokens), basis="")
        case Meeting():
            return Measure(quantity=text, value=None, unit="they came from different pours", basis="")
    raise AssertionError(condition)


def _named(token: str, stock: ChemicalStock) -> str:
    """The name of what was found; a class keeps its key."""
    record = stock.index.species.get(token) or stock.index.substances.get(token)
    return record.name if record is not None and record.name else token
