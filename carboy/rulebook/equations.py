"""Checks of the ``does`` lines: parts, balance in elements and charge, no fast equilibrium written as a reaction."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import islice

from carboy.chemistry.balance import balance, imbalance
from carboy.errors import RuleError
from carboy.model.rule import Reaction, ReactionTerm, Rule
from carboy.rulebook.composition import Composition
from carboy.rulebook.problems import Problem

MOST_BINDINGS = 3000
_SHOWN = 8


def equation_problems(rule: Rule, composition: Composition) -> Iterator[Problem]:
    """Problems of all equations of a rule whose names are known."""
    choices = composition.choices(rule)
    for reaction in rule.does:
        terms = (*reaction.reactants, *reaction.products)
        if all(_known(term, choices, composition) for term in terms):
            yield from _reaction_problems(rule, reaction, choices, composition)


def _known(term: ReactionTerm, choices: dict[str, tuple[str, ...]], composition: Composition) -> bool:
    return term.term in choices if term.term.startswith("?") else composition.is_token(term.term)


def _reaction_problems(
    rule: Rule, reaction: Reaction, choices: dict[str, tuple[str, ...]], composition: Composition
) -> Iterator[Problem]:
    variables = {term.term for term in (*reaction.reactants, *reaction.products) if term.term.startswith("?")}
    ways = list(islice(composition.bindings(choices, variables), MOST_BINDINGS + 1))
    if not ways:
        return  # the classes have no members, which the check of names reports
    if len(ways) > MOST_BINDINGS:
        message = (
            f"the classes bound here have more than {MOST_BINDINGS} combinations of members; only so many were balanced"
        )
        yield Problem(reaction.place, message, "note", rule=rule.id)
    failures: dict[str, list[str]] = {}
    sound = 0
    for binding in ways[:MOST_BINDINGS]:
        reason = _failure(reaction, binding, composition)
        if reason:
            failures.setdefault(reason, []).append(", ".join(f"{name} = {token}" for name, token in binding.items()))
        else:
            sound += 1
    for reason, bound in failures.items():
        if not variables:
            yield Problem(reaction.place, reason, rule=rule.id)
            continue
        shown = "; ".join(bound[:_SHOWN]) + (f" and {len(bound) - _SHOWN} more" if len(bound) > _SHOWN else "")
        # with no member left the equation can never run; with some it runs for those
        yield Problem(reaction.place, f"{reason}, for {shown}", "warning" if sound else "error", rule=rule.id)


def _failure(reaction: Reaction, binding: dict[str, str], composition: Composition) -> str:
    """Why the equation cannot run with these members; empty if it can."""
    sides: list[list[str]] = []
    for side in (reaction.reactants, reaction.products):
        tokens = []
        for term in side:
            token = composition.part(binding.get(term.term, term.term), term.part)
            if token is None or not composition.is_token(token):
                return f"the graph does not give '{term.term}.{term.part}'"
            tokens.append(token)
        sides.append(tokens)
    left, right = ([composition.formula(token) for token in side] for side in sides)
    written = [term.coefficient for term in (*reaction.reactants, *reaction.products)]
    if reaction.balance:
        fixed = {position: value for position, value in enumerate(written) if value is not None}
        try:
            counts: Sequence[float] = [float(value) for value in balance(left, right, fixed=fixed)]
        except RuleError as error:
            return error.message
    else:
        counts = [1.0 if value is None else value for value in written]
        pairs = list(zip(counts, (*left, *right), strict=True))
        excess = imbalance(pairs[: len(left)], pairs[len(left) :])
        if excess:
            listed = ", ".join(f"{value:+g} {key}" for key, value in excess.items())
            return f"the equation is not balanced (products less reactants: {listed})"
    if not _changes(sides, counts, composition):
        return "the equation restates fast equilibria, which are computed; leave the 'does' out and only flag it"
    return ""


def _changes(sides: list[list[str]], counts: Sequence[float], composition: Composition) -> bool:
    """Whether the reaction changes the amount of any component: what only moves along fast equilibria does not."""
    change: dict[str, float] = {}
    signs = [-1.0] * len(sides[0]) + [1.0] * len(sides[1])
    for sign, count, token in zip(signs, counts, (*sides[0], *sides[1]), strict=True):
        for component, inner in composition.components(token).items():
            change[component] = change.get(component, 0.0) + sign * count * inner
    return any(abs(value) > 1e-9 for value in change.values())
