"""The linter of the rule book: is a rule whole, are its names known, its equations balanced, its needs possible."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Mapping, Sequence

from carboy.model.knowledge import Index
from carboy.model.rule import (
    Bound,
    Condition,
    Earlier,
    Flag,
    Measured,
    Meeting,
    Place,
    Present,
    Rule,
    Vessel,
)
from carboy.rulebook.composition import Composition
from carboy.rulebook.equations import equation_problems
from carboy.rulebook.examples import ParsePortion, example_problems
from carboy.rulebook.logic import shadowed, unreachable
from carboy.rulebook.problems import Problem
from carboy.text.rule_grammar import closest

GAS_KINDS = ("toxic-gas", "flammable-gas", "asphyxiant-gas", "oxygen")
_VARIABLE = re.compile(r"\?[a-z][a-z0-9_]*")
# quantity -> the window outside which a figure is a slip
_SENSIBLE: dict[str, tuple[float, float]] = {
    "pH": (-2.0, 16.0),
    "temperature": (-100.0, 1000.0),
    "water fraction": (0.0, 1.0),
    "mass fraction": (0.0, 1.0),
    "strength": (0.0, 60.0),  # water itself is 55 mol/L
    "ionic strength": (0.0, 60.0),
    "amount": (0.0, math.inf),
    "mass": (0.0, math.inf),
    "headspace": (0.0, math.inf),
    "ratio": (0.0, math.inf),
}


def lint_rules(
    rules: Sequence[Rule],
    index: Index,
    *,
    names: Mapping[str, str] | None = None,
    parse_portion: ParsePortion | None = None,
) -> list[Problem]:
    """Every fault of ``rules`` against the graph, in the order of the rules.

    ``names`` maps folded names to what they mean (``substance:<id>``...) and serves suggestions; the names of the index
    where not given. ``parse_portion`` reads the portions of examples; without it they are not read.
    """
    composition = Composition(index)
    known = _Names(composition, index.names if names is None else names)
    problems: list[Problem] = []
    seen: dict[str, Rule] = {}
    for rule in rules:
        if rule.id in seen:
            first = seen[rule.id].place
            where = f" at {first.file}:{first.line}" if first else ""
            problems.append(Problem(rule.place, f"there is another rule of this id{where}", rule=rule.id))
        seen.setdefault(rule.id, rule)
        problems += _whole(rule)
        problems += known.check(rule)
        problems += _variables(rule)
        problems += _figures(rule)
        problems += equation_problems(rule, composition)
        problems += _gases(rule, composition)
        problems += unreachable(rule, composition)
        problems += example_problems(rule, parse_portion)
    problems += shadowed(rules)
    return problems


def _whole(rule: Rule) -> Iterator[Problem]:
    """Clauses that a rule must have."""
    missing = [
        word
        for word, there in (("title", rule.title), ("needs", rule.needs), ("says", rule.says), ("cites", rule.cites))
        if not there
    ]
    if rule.flags and not rule.guard:
        missing.append("guard")
    if missing:
        listed = " and no ".join(f"'{word}'" for word in missing)
        yield Problem(rule.place, f"the rule has no {listed}", rule=rule.id)
    if not rule.does and not rule.flags:
        yield Problem(rule.place, "the rule has neither 'does' nor 'flags', so it says nothing", rule=rule.id)


def _all_conditions(rule: Rule) -> Iterator[Condition]:
    yield from rule.needs
    for reaction in rule.does:
        yield from reaction.when
    for flag in rule.flags:
        yield from flag.when


class _Names:
    """Checks names against the graph and knows what may have been meant."""

    def __init__(self, composition: Composition, names: Mapping[str, str]) -> None:
        index = composition.index
        self._index = index
        self._composition = composition
        self._names = names
        self._tokens = {"H2O", "H+", *index.species, *index.substances}
        self._containers = {*index.containers}
        for key, container in index.containers.items():
            self._containers |= {key, container.name, *container.synonyms}

    def check(self, rule: Rule) -> Iterator[Problem]:
        def unknown(place: Place | None, term: str, what: str, choices: set[str]) -> Problem:
            return Problem(place, f"'{term}' is no {what} of the graph", "error", self._meant(term, choices), rule.id)

        classes = set(self._index.classes)
        for one in _all_conditions(rule):
            match one:
                case Bound(classes=keys, but_not=but_not):
                    asked: Sequence[str] = (*keys, *but_not)
                case Earlier(classes=keys):
                    asked = keys
                case Present(term=term):
                    asked = (term,)
                case Measured(quantity="property", term=term):
                    for name in self._unknown((term,), self._tokens):
                        yield unknown(one.place, name, "species or substance", self._tokens)
                    continue
                case Measured(term=term, other=other):
                    asked = tuple(name for name in (term, other) if name)
                case Vessel(about="container", words=words):
                    for word in words:
                        if (
                            word not in self._containers
                            and self._names.get(word.lower(), "").partition(":")[0] != "container"
                        ):
                            yield unknown(one.place, word, "container material", self._containers)
                    continue
                case Vessel() | Meeting():
                    continue
            for name in self._unknown(asked, self._tokens | classes):
                yield unknown(one.place, name, "class, species or substance", self._tokens | classes)
        for one_bound in rule.needs:
            if isinstance(one_bound, Bound):
                yield from self._members(rule, one_bound)
        for reaction in rule.does:
            written = [one.term for one in (*reaction.reactants, *reaction.products)]
            for name in self._unknown(written, self._tokens):
                yield unknown(reaction.place, name, "species or substance", self._tokens)
        for flag in rule.flags:
            yield from self._flag(rule, flag)
        for key in rule.cites:
            if key not in self._index.sources:
                yield Problem(
                    rule.place,
                    f"'{key}' is no source of the graph",
                    "error",
                    closest(key, tuple(self._index.sources)),
                    rule.id,
                )

    def _flag(self, rule: Rule, flag: Flag) -> Iterator[Problem]:
        allowed = self._tokens | {token.removesuffix("(g)") for token in (*self._index.gases, *self._index.species)}
        if flag.kind == "attack":
            allowed = allowed | self._containers
        for name in self._unknown(flag.terms, allowed):
            yield Problem(
                flag.place,
                f"'{name}' is no species or substance of the graph",
                "error",
                self._meant(name, allowed),
                rule.id,
            )
        judged = allowed | set(self._index.classes)
        for name in self._unknown((flag.weighed_by,) if flag.weighed_by else (), judged):
            yield Problem(
                flag.place,
                f"'{name}' is no species or substance of the graph",
                "error",
                self._meant(name, judged),
                rule.id,
            )

    def _members(self, rule: Rule, one: Bound) -> Iterator[Problem]:
        known = [key for key in one.classes if key in self._index.classes or key in self._tokens]
        if (
            known
            and len(known) == len(one.classes)
            and not self._composition.members(one.classes, one.but_not, one.where)
        ):
            yield Problem(
                one.place, f"nothing in the graph can be bound to {one.variable} here", "warning", rule=rule.id
            )

    @staticmethod
    def _unknown(terms: Sequence[str], choices: set[str]) -> list[str]:
        return [term for term in terms if not term.startswith("?") and term not in choices]

    def _meant(self, term: str, choices: set[str]) -> tuple[str, ...]:
        """What the name means to the resolver of labels first, then what is spelt alike."""
        folded = term.replace("-", " ").lower()
        meaning = next((self._names[key].partition(":")[2] for key in (folded, term.lower()) if key in self._names), "")
        return tuple(dict.fromkeys([*([meaning] if meaning in choices else []), *closest(term, tuple(choices))]))[:3]


def _variables(rule: Rule) -> Iterator[Problem]:
    """Variables that no ``is`` of ``needs`` binds."""
    bound = {one.variable for one in rule.needs if isinstance(one, Bound)}
    remembered = {one.variable for one in rule.needs if isinstance(one, Earlier)}

    def check(place: Place | None, names: Sequence[str], *, words: bool = False) -> Iterator[Problem]:
        for name in dict.fromkeys(names):
            if name in bound or (words and name in remembered):
                continue
            hint = " (what is only remembered by 'earlier' has no amount now)" if name in remembered else ""
            yield Problem(
                place, f"no 'is' of the needs binds {name}{hint}", "error", closest(name, tuple(bound)), rule.id
            )

    for one in _all_conditions(rule):
        match one:
            case Measured(term=term, other=other):
                yield from check(one.place, [name for name in (term, other) if name.startswith("?")])
            case Meeting(first=first, second=second):
                yield from check(one.place, [first, second])
            case Bound(variable=variable):
                yield from check(one.place, [variable])  # within 'when' an 'is' tests what needs has bound
            case _:
                pass
    for reaction in rule.does:
        terms = [term.term for term in (*reaction.reactants, *reaction.products)]
        yield from check(reaction.place, [name for name in terms if name.startswith("?")])
    for flag in rule.flags:
        names = [name.partition(".")[0] for name in (*flag.terms, flag.weighed_by) if name.startswith("?")]
        yield from check(flag.place, [*names, *_VARIABLE.findall(flag.words)])
    for text in (rule.says, *rule.guard, rule.title):
        yield from check(rule.place, _VARIABLE.findall(text), words=True)


def _figures(rule: Rule) -> Iterator[Problem]:
    """Figures outside the window of their quantity, as a wrong unit gives them."""
    for one in _all_conditions(rule):
        if not isinstance(one, Measured) or one.quantity not in _SENSIBLE:
            continue
        low, high = _SENSIBLE[one.quantity]
        for figure in {one.low, one.high}:
            if math.isfinite(figure) and not low <= figure <= high:
                about = f"{one.quantity} of {one.term}" if one.term else one.quantity
                yield Problem(
                    one.place, f"{figure:g} is outside what a {about} can be ({low:g} to {high:g})", rule=rule.id
                )


def _gases(rule: Rule, composition: Composition) -> Iterator[Problem]:
    """What is flagged as a gas must be a gas of the graph."""
    choices = composition.choices(rule)
    for flag in rule.flags:
        if flag.kind not in GAS_KINDS:
            continue
        if not flag.terms and not flag.words:
            yield Problem(flag.place, f"'{flag.kind}' names its gas: '{flag.kind} of ...'", rule=rule.id)
        for term in flag.terms:
            name, _, part = term.partition(".") if term.startswith("?") else (term, "", "")
            tokens = choices.get(name, ()) if name.startswith("?") else (name,)
            parts = [composition.part(token, part) for token in tokens]
            lacking = [
                token
                for token, mine in zip(tokens, parts, strict=True)
                if mine is None or composition.gas(mine) is None
            ]
            if lacking:
                some = name.startswith("?") and len(lacking) < len(tokens)
                listed = ", ".join(lacking[:8]) + (", ..." if len(lacking) > 8 else "")
                message = f"'{term}' is flagged as {flag.kind}, but the graph has no gas {listed}"
                yield Problem(flag.place, message, "warning" if some else "error", _alike(term, composition), rule.id)


def _alike(term: str, composition: Composition) -> tuple[str, ...]:
    gases = {token.removesuffix("(g)") for token in composition.index.gases}
    return () if term.startswith("?") else closest(term, tuple(gases))
