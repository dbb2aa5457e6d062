"""What the graph and the rules leave uncovered: classes that no rule asks for, substances that no rule can bind, rules that
nothing has fired yet, gases without a Henry constant, substances without a CAS number.

A gap is not always a fault (a salt acts through its ions, a vapour need not dissolve); the record is there to be read.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass

import msgspec

from carboy.model.knowledge import Index
from carboy.model.plan import Case
from carboy.model.rule import Example, Rule
from carboy.rulebook.running import ExampleRunner
from carboy.vetting import Laboratory

Progress = Callable[[int, int], None]


@dataclass(frozen=True, slots=True)
class Coverage:
    """Keys, ids and tokens, each list in alphabetical order. ``rules_not_fired`` is None where nothing was run."""

    classes_without_rule: tuple[str, ...]
    substances_without_class: tuple[str, ...]
    gases_without_henry_constant: tuple[str, ...]
    substances_without_cas: tuple[str, ...]
    rules_not_fired: tuple[str, ...] | None = None


def coverage(index: Index, rules: Iterable[Rule], fired: Iterable[str] | None = None) -> Coverage:
    """The gaps of a graph and its rules.

    ``fired``: ids of the rules that cases or examples have fired, from :func:`rules_fired`; None: not asked.
    """
    book = tuple(rules)
    return Coverage(
        classes_without_rule=_classes_without_rule(index, book),
        substances_without_class=_substances_without_class(index),
        gases_without_henry_constant=_gases_without_henry_constant(index),
        substances_without_cas=tuple(sorted(key for key, item in index.substances.items() if not item.cas)),
        rules_not_fired=None if fired is None else _not_fired(book, fired),
    )


def rules_fired(
    laboratory: Laboratory, cases: Iterable[Case], *, examples: bool = True, progress: Progress | None = None
) -> frozenset[str]:
    """Ids of the rules that support a finding, or change a vessel, in any of the cases or (``examples``) in a ``fires`` line of
    any rule. Runs all of them on the engine: minutes. Raises CarboyError where a case or example cannot be carried out.
    """
    runner = ExampleRunner(laboratory)
    plans = tuple(cases)
    lines: tuple[Example, ...] = ()
    if examples:
        lines = tuple(example for rule in laboratory.rules if not rule.off for example in rule.fires)
    total = len(plans) + len(lines)
    fired: set[str] = set()
    for number, case in enumerate(plans, start=1):
        fired |= {rule for rule, _, _ in runner.run(case)}
        if progress is not None:
            progress(number, total)
    for number, example in enumerate(lines, start=len(plans) + 1):
        fired |= {rule for rule, _, _ in runner(example)}
        if progress is not None:
            progress(number, total)
    return frozenset(fired)


def _not_fired(rules: tuple[Rule, ...], fired: Iterable[str]) -> tuple[str, ...]:
    known = set(fired)
    return tuple(sorted(rule.id for rule in rules if not rule.off and rule.id not in known))


def _classes_without_rule(index: Index, rules: tuple[Rule, ...]) -> tuple[str, ...]:
    """Classes that neither a rule nor the list of a container material asks for, itself or by a class above it."""
    asked = {text for rule in rules if not rule.off for text in _texts(msgspec.to_builtins(rule.needs))}
    asked |= {text for rule in rules if not rule.off for text in _texts(msgspec.to_builtins(rule.does))}
    asked |= {text for rule in rules if not rule.off for text in _texts(msgspec.to_builtins(rule.flags))}
    asked |= {attack.attacker for item in index.containers.values() for attack in item.attacks}
    return tuple(sorted(key for key in index.classes if not asked.intersection(index.ancestors[key])))


def _texts(value: object) -> Iterator[str]:
    """Every text in a tree of plain data."""
    if isinstance(value, str):
        yield value
    elif isinstance(value, dict):
        for inner in value.values():
            yield from _texts(inner)
    elif isinstance(value, list | tuple):
        for inner in value:
            yield from _texts(inner)


def _substances_without_class(index: Index) -> tuple[str, ...]:
    """Substances that have no class, nor has anything that they give in water."""
    return tuple(
        sorted(
            key
            for key, item in index.substances.items()
            if not item.classes
            and not any(index.species[token].classes for token in item.yields if token in index.species)
        )
    )


def _gases_without_henry_constant(index: Index) -> tuple[str, ...]:
    dissolving = {item.product for item in index.equilibria if item.kind == "gas"}
    return tuple(sorted(token for token in index.gases if token not in dissolving))
