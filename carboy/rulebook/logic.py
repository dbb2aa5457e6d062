"""Checks of the conditions of rules against one another: what can never hold, and what another rule says already."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Iterator, Sequence

from carboy.model.rule import Bound, Condition, Measured, Place, Present, Rule, Vessel
from carboy.rulebook.composition import Composition
from carboy.rulebook.problems import Problem, Severity
from carboy.text.rule_printer import condition_text, flag_text, reaction_text

_VARIABLE = re.compile(r"\?[a-z][a-z0-9_]*")
_OPEN_ENDS = ("above", "below")


def unreachable(rule: Rule, composition: Composition) -> Iterator[Problem]:
    """Conditions of a rule, or of one of its lines, that cannot hold together."""
    found = list(_contradictions(rule.needs, composition))
    for first, second in found:
        yield _problem(rule, "the rule can never fire", first, second)
    if found:
        return
    for reaction in rule.does:
        for first, second in _contradictions((*rule.needs, *reaction.when), composition):
            yield _problem(rule, "this line can never hold", first, second)
    for flag in rule.flags:
        for first, second in _contradictions((*rule.needs, *flag.when), composition):
            # what the rule does may bring the vessel out of its own needs before the flag is looked at
            yield _problem(rule, "this line can never hold", first, second, "warning" if rule.does else "error")


def _problem(rule: Rule, what: str, first: Condition, second: Condition, severity: Severity = "error") -> Problem:
    message = f"{what}: '{condition_text(second)}' contradicts '{condition_text(first)}'"
    return Problem(second.place, message, severity, rule=rule.id)


def _contradictions(conditions: Sequence[Condition], composition: Composition) -> Iterator[tuple[Condition, Condition]]:
    for position, second in enumerate(conditions):
        for first in conditions[:position]:
            if _contradict(first, second, composition) or _contradict(second, first, composition):
                yield first, second


def _contradict(first: Condition, second: Condition, composition: Composition) -> bool:
    match first, second:
        case Measured(), Measured():
            same = (first.quantity, first.term, first.other) == (second.quantity, second.term, second.other)
            return same and not _overlap(first, second)
        case Vessel(), Vessel():
            return first.about == second.about and _vessels_apart(first, second)
        case Present(negated=False), Present(negated=True):
            return _covers(second, (first.term,), first.where, composition)
        case Bound(), Present(negated=True):
            return _covers(second, first.classes, first.where, composition)
    return False


def _overlap(first: Measured, second: Measured) -> bool:
    low, high = max(first.low, second.low), min(first.high, second.high)
    if low == high:
        ends = [one for one in (first, second) if one.compare in _OPEN_ENDS and low in (one.low, one.high)]
        return not ends and math.isfinite(low)
    return low < high


def _vessels_apart(first: Vessel, second: Vessel) -> bool:
    mine, other = set(first.words), set(second.words)
    if first.about == "container":  # a container answers to several names, so two of them may both hold
        return (
            first.negated != second.negated
            and bool(mine & other)
            and (mine <= other if second.negated else other <= mine)
        )
    if first.negated and second.negated:
        return mine | other >= {"open", "loose", "vented", "sealed"}
    if first.negated or second.negated:
        asked, refused = (other, mine) if first.negated else (mine, other)
        return asked <= refused
    return not mine & other


def _covers(absent: Present, keys: Iterable[str], where: str, composition: Composition) -> bool:
    """Whether everything that ``keys`` name is already excluded by ``absent``."""
    if absent.where not in ("any", where):
        return False
    ancestors = composition.index.ancestors
    return all(
        absent.term == key or absent.term in ancestors.get(key, ()) or absent.term in composition.above(key)
        for key in keys
    )


def shadowed(rules: Sequence[Rule]) -> Iterator[Problem]:
    """Rules whose conditions and flags another rule before them has already."""
    seen: dict[tuple[frozenset[str], frozenset[str]], list[tuple[Rule, frozenset[str]]]] = {}
    for rule in rules:
        needs, flags, does = _sayings(rule)
        for other, others in seen.setdefault((needs, flags), []):
            if does == others or (flags and (not does or not others)):
                yield Problem(
                    rule.place, f"rule '{other.id}'{_at(other.place)} has the same needs and flags", rule=rule.id
                )
                break
        seen[needs, flags].append((rule, does))


def _at(place: Place | None) -> str:
    return f" at {place.file}:{place.line}" if place else ""


def _sayings(rule: Rule) -> tuple[frozenset[str], frozenset[str], frozenset[str]]:
    """Needs, flags and equations as text.

    The variables are numbered in the order of ``needs``, so that their names do not tell rules apart.
    """
    needs = [condition_text(one) for one in rule.needs]
    order: dict[str, str] = {}
    for name in _VARIABLE.findall(" ".join(needs)):
        order.setdefault(name, f"?v{len(order)}")

    def plain(texts: Iterable[str]) -> frozenset[str]:
        return frozenset(_VARIABLE.sub(lambda found: order.get(found[0], found[0]), text) for text in texts)

    return plain(needs), plain(map(flag_text, rule.flags)), plain(map(reaction_text, rule.does))
