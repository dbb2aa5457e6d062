"""Questions to the graph and the rules in the words of the rules: ``?r gives ?g, ?g is toxic-gas, ?r needs acid``.

A pattern is clauses joined by commas, each SUBJECT RELATION OBJECT. A word with ``?`` is unknown; the answer is every
way to fill the unknowns. Relations:

* ``is`` a class (of substances, species and classes; ``or`` and ``but not`` as in the rules);
* ``gives``: what a rule makes, or names as its hazard;
* ``needs``: what a rule must find. ``acid`` and ``base`` are met by an upper or lower limit on the pH as well;
* ``flags`` a kind of hazard, ``cites`` a source (rules);
* ``contains``: what a material is made of, what elements a substance has;
* ``dissolves into``: the species that a substance gives in water;
* ``attacks``: what a container material does not stand.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Literal, get_args

from carboy.errors import InputError
from carboy.knowledge.names import Names
from carboy.model.knowledge import Index
from carboy.model.rule import Bound, Earlier, Kind, Measured, Present, ReactionTerm, Rule
from carboy.rulebook.composition import Composition
from carboy.span import Span
from carboy.text.formulas import elements, plain_formula

Sort = Literal["chemical", "class", "rule", "kind", "source", "material", "container", "element"]
Thing = tuple[Sort, str]
Answer = dict[str, Thing]

RELATIONS = ("dissolves into", "is", "gives", "needs", "flags", "cites", "contains", "attacks")
MOST_ANSWERS = 5000
_RELATION = "|".join(RELATIONS).replace(" ", r"\s+")
_CLAUSE = re.compile(rf"(?P<subject>\S.*?)\s+(?P<relation>{_RELATION})\s+(?P<object>\S.*)")
_OF_CHEMICALS = ("gives", "contains", "dissolves into")
_VARIABLE = re.compile(r"\?[a-z][a-z0-9_]*")
_PROTON, _HYDROXIDE = "H+", "OH-"
_ACID, _BASE = "acid", "base"  # class keys


@dataclass(frozen=True, slots=True)
class Clause:
    """One clause. An end is a variable, or the things that it may be and must not be."""

    subject: str | frozenset[Thing]
    relation: str
    object: str | frozenset[Thing]
    without: frozenset[Thing] = frozenset()


class Relation:
    """Pairs of things, found from either end."""

    def __init__(self, pairs: Iterable[tuple[Thing, Thing]]) -> None:
        self.forward: dict[Thing, set[Thing]] = {}
        self.backward: dict[Thing, set[Thing]] = {}
        for subject, value in pairs:
            self.forward.setdefault(subject, set()).add(value)
            self.backward.setdefault(value, set()).add(subject)


class Questions:
    """Answers patterns over one graph and one book of rules."""

    def __init__(self, index: Index, rules: Sequence[Rule]) -> None:
        self.index = index
        self.rules = {rule.id: rule for rule in rules if not rule.off}
        self.names = Names(index)
        self.composition = Composition(index)
        self._relations: dict[str, Relation] = {}

    def ask(self, pattern: str) -> tuple[list[str], list[Answer]]:
        """The variables in the order of the pattern, and the answers in steady order. Raises InputError."""
        clauses = self.read(pattern)
        variables = list(dict.fromkeys(_VARIABLE.findall(pattern)))
        answers: list[Answer] = [{}]
        waiting = list(clauses)
        while waiting:
            known = set(answers[0]) if answers else set()
            waiting.sort(key=lambda clause: self._effort(clause, known))
            answers = [more for answer in answers for more in self._fill(waiting[0], answer)]
            waiting.pop(0)
            if len(answers) > MOST_ANSWERS:
                raise InputError(f"the pattern has more than {MOST_ANSWERS} answers; add a clause that narrows it")
            if not answers:
                break
        unique = {tuple(answer[name] for name in variables): answer for answer in answers}
        return variables, [unique[key] for key in sorted(unique)]

    # --- reading

    def read(self, pattern: str) -> list[Clause]:
        """The clauses of a pattern. Raises InputError with the place of the fault."""
        clauses = []
        for found in re.finditer(r"(?:[^,]|,(?=\S))+", pattern):
            start = found.start() + len(found[0]) - len(found[0].lstrip())
            words = found[0].strip()
            if words:
                clauses.append(self._clause(pattern, start, words))
        if not clauses:
            raise InputError("a pattern has clauses such as '?r gives ?g, ?g is toxic-gas'")
        if not _VARIABLE.search(pattern):
            raise InputError("a pattern asks for something: it has a word with a question mark, such as '?r'")
        return clauses

    def _clause(self, pattern: str, start: int, words: str) -> Clause:
        found = _CLAUSE.fullmatch(words)
        if found is None:
            message = f"a clause is SUBJECT RELATION OBJECT; a relation is one of {', '.join(sorted(RELATIONS))}"
            raise InputError(message, span=Span(pattern, start, start + len(words)))
        relation = " ".join(found["relation"].split())
        subject = self._end(pattern, start, found["subject"], relation, first=True)
        body, *excluded = re.split(r"\s+but\s+not\s+", found["object"])
        where = start + found.start("object")
        value = self._end(pattern, where, body, relation, first=False)
        without: set[Thing] = set()
        for exception in excluded:
            things = self._end(pattern, where + found["object"].find(exception), exception, relation, first=False)
            if isinstance(things, str):
                raise InputError(
                    "what is excluded is named, not asked for", span=Span(pattern, where, where + len(found["object"]))
                )
            without |= things
        return Clause(subject, relation, value, frozenset(without))

    def _end(self, pattern: str, start: int, words: str, relation: str, *, first: bool) -> str | frozenset[Thing]:
        if words.startswith("?"):
            if not _VARIABLE.fullmatch(words):
                raise InputError(
                    f"'{words}' is no variable; it is '?' and a lower-case word",
                    span=Span(pattern, start, start + len(words)),
                )
            return words
        things: set[Thing] = set()
        at = start
        for word in re.split(r"(\s+or\s+)", words):
            name = word.strip()
            if name and name != "or":
                things |= self._meant(pattern, at, word, relation, first)
            at += len(word)
        return frozenset(things)

    def _meant(self, pattern: str, start: int, word: str, relation: str, first: bool) -> set[Thing]:
        """What a word stands for at this end of a relation."""
        readers: dict[tuple[str, bool], tuple[Callable[[str], set[Thing]], ...]] = {
            ("is", True): (self._chemical, self._class),
            ("is", False): (self._class, self._chemical),
            ("gives", True): (self._rule,),
            ("gives", False): (self._chemical, self._class),
            ("needs", True): (self._rule,),
            ("needs", False): (self._class, self._chemical),
            ("flags", True): (self._rule,),
            ("flags", False): (self._kind,),
            ("cites", True): (self._rule,),
            ("cites", False): (self._source,),
            ("contains", True): (self._material, self._chemical),
            ("contains", False): (self._element, self._chemical, self._class),
            ("dissolves into", True): (self._chemical,),
            ("dissolves into", False): (self._chemical, self._class),
            ("attacks", True): (self._class, self._chemical),
            ("attacks", False): (self._container,),
        }
        for reader in readers[relation, first]:
            found = reader(word.strip())
            if found:
                return found
        special: dict[Callable[[str], set[Thing]], str] = {
            self._rule: "rule",
            self._kind: "kind of hazard",
            self._source: "source",
            self._container: "container material",
        }
        what = special.get(readers[relation, first][0], "class, species or substance")
        choices: dict[str, Iterable[str]] = {
            "rule": self.rules,
            "kind of hazard": get_args(Kind),
            "source": self.index.sources,
            "container material": self.index.containers,
        }
        raise InputError(
            f"'{word.strip()}' is no {what} that is known here",
            span=Span(pattern, start, start + len(word)),
            suggestions=self._near(word.strip(), choices.get(what)),
        )

    def _near(self, word: str, choices: Iterable[str] | None) -> tuple[str, ...]:
        from rapidfuzz import process  # only for a word that was not found

        near = () if choices is not None else self.names.suggest(word, 2)
        listed = [*choices] if choices is not None else [*self.index.classes]
        return tuple(
            dict.fromkeys([*(one for one, _, _ in process.extract(word, listed, limit=2, score_cutoff=70)), *near])
        )[:3]

    def _class(self, word: str) -> set[Thing]:
        key = self.names.chemical_class(word)
        return {("class", key)} if key else set()

    def _chemical(self, word: str) -> set[Thing]:
        match = self.names.resolve(word)
        if match.kind in ("substance", "species"):
            return {("chemical", self.canonical(match.id))}
        gas = self.names.gas(word)
        return {("chemical", self.canonical(gas))} if gas else set()

    def _material(self, word: str) -> set[Thing]:
        match = self.names.resolve(word)
        return {("material", match.id)} if match.kind == "material" else set()

    def _element(self, word: str) -> set[Thing]:
        return {("element", one.symbol) for one in elements().values() if word in (one.symbol, one.name)}

    def _rule(self, word: str) -> set[Thing]:
        return {("rule", word)} if word in self.rules else set()

    def _kind(self, word: str) -> set[Thing]:
        return {("kind", word)} if word in get_args(Kind) else set()

    def _source(self, word: str) -> set[Thing]:
        return {("source", word)} if word in self.index.sources else set()

    def _container(self, word: str) -> set[Thing]:
        key = self.names.container(word)
        return {("container", key)} if key else set()

    # --- answering

    def _effort(self, clause: Clause, known: set[str]) -> tuple[int, int]:
        free = sum(isinstance(end, str) and end not in known for end in (clause.subject, clause.object))
        return free, RELATIONS.index(clause.relation)

    def _fill(self, clause: Clause, answer: Answer) -> Iterator[Answer]:
        relation = self.relation(clause.relation, asked=isinstance(clause.object, str))
        subjects = self._candidates(clause.subject, answer)
        objects = self._candidates(clause.object, answer)
        excluded = self._excluded(clause, relation)
        if subjects is not None:
            wanted = None if objects is None else self._widened(clause, objects)
            pairs = (
                (subject, value)
                for subject in subjects
                for value in _common(relation.forward.get(subject, set()), wanted)
            )
        elif objects is not None:
            wanted = self._widened(clause, objects)
            pairs = ((subject, value) for value in wanted for subject in relation.backward.get(value, ()))
        else:
            pairs = ((subject, value) for subject, values in relation.forward.items() for value in values)
        seen = set()
        for subject, value in pairs:
            if subject in excluded:
                continue
            more = dict(answer)
            if isinstance(clause.subject, str):
                more[clause.subject] = subject
            if isinstance(clause.object, str):
                more[clause.object] = value
            mark = tuple(sorted(more.items()))
            if mark not in seen:
                seen.add(mark)
                yield more

    def _candidates(self, end: str | frozenset[Thing], answer: Answer) -> frozenset[Thing] | None:
        if isinstance(end, str):
            return frozenset((answer[end],)) if end in answer else None
        return end

    def _widened(self, clause: Clause, objects: frozenset[Thing]) -> set[Thing]:
        """Classes as objects of relations that hold chemicals stand for their members."""
        wanted = set(objects)
        if clause.relation in _OF_CHEMICALS:
            for one in objects:
                if one[0] == "class":
                    wanted |= {member for member in self._is.backward.get(one, ()) if member[0] == "chemical"}
        return wanted

    def _excluded(self, clause: Clause, relation: Relation) -> set[Thing]:
        return {
            subject for value in self._widened(clause, clause.without) for subject in relation.backward.get(value, ())
        }

    # --- relations

    @property
    def _is(self) -> Relation:
        return self.relation("is")

    def relation(self, name: str, *, asked: bool = False) -> Relation:
        """The pairs of a relation. ``needs`` with an object that is ``asked`` for has the terms as the rules write them."""
        key = f"{name} as written" if name == "needs" and asked else name
        if key not in self._relations:
            makers: dict[str, Callable[[], Iterable[tuple[Thing, Thing]]]] = {
                "is": self._is_pairs,
                "gives": self._gives_pairs,
                "needs": self._needs_pairs,
                "needs as written": self._written_needs,
                "flags": lambda: (
                    (("rule", one.id), ("kind", flag.kind)) for one in self.rules.values() for flag in one.flags
                ),
                "cites": lambda: (
                    (("rule", one.id), ("source", source)) for one in self.rules.values() for source in one.cites
                ),
                "contains": self._contains_pairs,
                "dissolves into": self._dissolves_pairs,
                "attacks": self._attacks_pairs,
            }
            self._relations[key] = Relation(makers[key]())
        return self._relations[key]

    @cached_property
    def _canonical(self) -> dict[str, str]:
        """Substance id or gas token -> the species that is the same molecule, that in water before that in the air."""
        species = self.index.species
        same = {}
        for token in species:
            bare = token.removesuffix("(g)")
            if bare != token and bare in species:
                same[token] = bare
        by_formula: dict[str, list[str]] = {}
        for key, item in self.index.substances.items():
            by_formula.setdefault(plain_formula(item.formula), []).append(key)
        for key, item in self.index.substances.items():
            formula = plain_formula(item.formula)
            candidates = [token for token, count in item.yields.items() if len(item.yields) == 1 and count == 1.0]
            # a formula that isomers share tells nothing, and a salt is no molecule
            if len(by_formula[formula]) == 1 and item.state != "s":
                candidates += [formula, f"{formula}(g)"]
            for token in candidates:
                record = species.get(token)
                if (
                    record is not None
                    and record.charge == 0
                    and record.phase in ("aq", "g")
                    and record.atoms == item.atoms
                ):
                    same[key] = same.get(token, token)
                    break
        return same

    def canonical(self, token: str) -> str:
        """One name for a molecule that is there as a substance, in water and in the air."""
        return self._canonical.get(token, token)

    def _is_pairs(self) -> Iterator[tuple[Thing, Thing]]:
        ancestors = self.index.ancestors
        stated = [(key, item.classes) for key, item in self.index.substances.items()]
        stated += [(key, item.classes) for key, item in self.index.species.items()]
        for key, groups in stated:
            thing: Thing = ("chemical", self.canonical(key))
            yield thing, thing
            for group in groups:
                for above in ancestors.get(group, (group,)):
                    yield thing, ("class", above)
        for key in self.index.classes:
            for above in ancestors.get(key, (key,)):
                yield ("class", key), ("class", above)

    def _gives_pairs(self) -> Iterator[tuple[Thing, Thing]]:
        for rule in self.rules.values():
            choices = self.composition.choices(rule)
            tokens: set[str] = set()
            for reaction in rule.does:
                for term in reaction.products:
                    tokens.update(self._expanded(term, choices))
            for flag in rule.flags:
                for name in flag.terms:
                    subject, _, part = name.partition(".") if name.startswith("?") else (name, "", "")
                    tokens.update(self._expanded(ReactionTerm(subject, part), choices))
            for token in sorted(tokens):
                yield ("rule", rule.id), ("chemical", self.canonical(token))

    def _expanded(self, term: ReactionTerm, choices: dict[str, tuple[str, ...]]) -> Iterator[str]:
        for token in choices.get(term.term, ()) if term.term.startswith("?") else (term.term,):
            found = self.composition.part(token, term.part)
            if found is not None:
                yield found

    def _thing(self, term: str) -> Thing:
        return ("class", term) if term in self.index.classes else ("chemical", self.canonical(term))

    def _written_needs(self) -> Iterator[tuple[Thing, Thing]]:
        for rule in self.rules.values():
            for one in rule.needs:
                terms: Sequence[str] = ()
                if isinstance(one, Bound | Earlier):
                    terms = one.classes
                elif isinstance(one, Present) and not one.negated:
                    terms = (one.term,)
                for term in terms:
                    yield ("rule", rule.id), self._thing(term)
            yield from ((("rule", rule.id), ("class", key)) for key in _sides(rule) if key in self.index.classes)

    def _needs_pairs(self) -> Iterator[tuple[Thing, Thing]]:
        """A need is met by what is of its class, and a class is needed where something below it is."""
        for rule, need in self._written_needs():
            yield rule, need
            for above in self._is.forward.get(need, ()):
                yield rule, above
            for below in self._is.backward.get(need, ()):
                yield rule, below

    def _contains_pairs(self) -> Iterator[tuple[Thing, Thing]]:
        for key, item in self.index.materials.items():
            for substance in (*(part.substance for part in item.parts), item.balance):
                if substance in self.index.substances:
                    yield ("material", key), ("chemical", self.canonical(substance))
        atoms = [(key, record.atoms) for key, record in self.index.substances.items()]
        atoms += [(key, record.atoms) for key, record in self.index.species.items()]
        for key, counts in atoms:
            for symbol in counts:
                yield ("chemical", self.canonical(key)), ("element", symbol)

    def _dissolves_pairs(self) -> Iterator[tuple[Thing, Thing]]:
        for key, item in self.index.substances.items():
            for token, count in item.yields.items():
                if count > 0:
                    yield ("chemical", self.canonical(key)), ("chemical", self.canonical(token))

    def _attacks_pairs(self) -> Iterator[tuple[Thing, Thing]]:
        for key, item in self.index.containers.items():
            for attack in item.attacks:
                attacker = self._thing(attack.attacker)
                yield attacker, ("container", key)
                for below in self._is.backward.get(attacker, ()):
                    yield below, ("container", key)


def _common(values: set[Thing], wanted: set[Thing] | None) -> Iterable[Thing]:
    return values if wanted is None else values & wanted


def _sides(rule: Rule) -> set[str]:
    """``acid`` or ``base`` where a rule uses their ions up, or holds only below or only above some pH."""
    found = set()
    for reaction in rule.does:
        tokens = {term.term for term in reaction.reactants}
        found |= ({_ACID} if _PROTON in tokens else set()) | ({_BASE} if _HYDROXIDE in tokens else set())
    limits = [one for one in rule.needs if isinstance(one, Measured) and one.quantity == "pH"]
    upper = any(math.isfinite(one.high) for one in limits)
    lower = any(math.isfinite(one.low) for one in limits)
    if upper != lower:
        found.add(_ACID if upper else _BASE)
    return found
