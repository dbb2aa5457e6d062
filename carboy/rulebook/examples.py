"""The ``fires`` and ``silent`` lines of rules: are there enough, can they be read, does the engine bear them out."""

from __future__ import annotations

import re
from collections.abc import Callable, Collection, Iterable, Iterator, Sequence

from carboy.errors import CarboyError
from carboy.model.plan import Portion
from carboy.model.rule import Example, Rule
from carboy.rulebook.problems import Problem

ParsePortion = Callable[[str], Portion]
# what was found in one example: (rule id, kinds of hazard, species as plain formulas)
Found = tuple[str, Collection[str], Collection[str]]
Runner = Callable[[Example], Iterable[Found]]

FLOOR = 2
# Words that stand in many portions and so do not make two examples alike.
_COMMON = frozenset(
    (
        "about", "acid", "an", "and", "approximately", "aqueous", "at", "concentrated", "dilute",
        "in", "least", "most", "of", "or", "powder", "pure", "saturated", "solution",
        "the", "to", "trace", "unknown", "up", "water", "with",
    )
)  # fmt: skip
_WORD = re.compile(r"[A-Za-z][A-Za-z0-9]*")
_UNITS = frozenset(
    (
        "mL",
        "L",
        "g",
        "mg",
        "kg",
        "mol",
        "mmol",
        "M",
        "mM",
        "N",
        "ppm",
        "w",
        "v",
        "drop",
        "drops",
        "h",
        "min",
        "degC",
        "pH",
    )
)


def example_problems(rule: Rule, parse_portion: ParsePortion | None) -> Iterator[Problem]:
    """Too few examples, no near miss, portions that cannot be read. Without ``parse_portion`` portions are not read."""
    for word, lines in (("fires", rule.fires), ("silent", rule.silent)):
        if len(lines) < FLOOR:
            yield Problem(
                rule.place, f"a rule has at least {FLOOR} '{word}' lines, this one has {len(lines)}", rule=rule.id
            )
        texts: set[tuple[object, ...]] = set()
        for one in lines:
            same = (one.portions, tuple(sorted(one.setting.items())))
            if same in texts:
                yield Problem(one.place, f"this '{word}' line stands here twice", rule=rule.id)
            texts.add(same)
    if rule.fires and rule.silent and not any(_near(silent, rule.fires) for silent in rule.silent):
        message = "no 'silent' line is a near miss: one must share a substance with a 'fires' line"
        yield Problem(rule.silent[0].place, message, rule=rule.id)
    for silent in rule.silent:
        if silent.expect:
            yield Problem(silent.place, "a 'silent' line has no expectation after '->'", rule=rule.id)
    if parse_portion is None:
        return
    for one in (*rule.fires, *rule.silent):
        for text in one.portions:
            try:
                portion = parse_portion(text)
            except CarboyError as error:
                yield Problem(
                    one.place,
                    f"the portion '{text}' cannot be read: {error.message}",
                    "error",
                    error.suggestions,
                    rule.id,
                )
                continue
            for item in portion.ingredients:
                if item.reference == "unrecognised":
                    message = f"'{item.words}' in the portion '{text}' is not in the graph"
                    yield Problem(one.place, message, "error", item.suggestions, rule.id)


def portion_words(example: Example) -> frozenset[str]:
    """The words of an example that name something, in lower case."""
    words = _WORD.findall(" ".join(example.portions))
    return frozenset(word.lower() for word in words if word not in _UNITS and word.lower() not in _COMMON)


def _near(silent: Example, fires: Sequence[Example]) -> bool:
    mine = portion_words(silent)
    return any(mine & portion_words(one) for one in fires)


def run_examples(rules: Iterable[Rule], runner: Runner) -> list[Problem]:
    """Run every example of every rule that is not switched off, and list those that the engine does not bear out.

    ``runner`` gives what was found in an example: for each finding the rules that support it, one entry a rule. A
    ``fires`` line must find its rule, with its expectation among the kinds or species of that rule's entries; a
    ``silent`` line must not find it. A ``known miss`` must fail: that it passes is a problem too.
    """
    problems = []
    for rule in rules:
        if rule.off:
            continue
        for fires, lines in ((True, rule.fires), (False, rule.silent)):
            for example in lines:
                failure, broken = _outcome(rule, example, fires, runner)
                if example.known_miss and not failure:
                    message = f"'{example.text}' is marked as a known miss but passes now; take the mark away"
                    problems.append(Problem(example.place, message, rule=rule.id))
                elif failure and (broken or not example.known_miss):
                    problems.append(Problem(example.place, failure, rule=rule.id))
    return problems


def _outcome(rule: Rule, example: Example, fires: bool, runner: Runner) -> tuple[str, bool]:
    """Why the example fails, empty if it passes; and whether it could not be run at all."""
    try:
        found = [entry for entry in runner(example) if entry[0] == rule.id]
    except CarboyError as error:
        return f"'{example.text}' could not be run: {error.message}", True
    if not fires:
        kinds = sorted({kind for _, kinds, _ in found for kind in kinds})
        return (
            f"'{example.text}' must be silent but the rule fires ({', '.join(kinds) or 'without a flag'})"
            if found
            else ""
        ), False
    if not found:
        return f"'{example.text}' must fire but the rule is silent", False
    seen = {word for _, kinds, species in found for word in (*kinds, *species)}
    if example.expect and example.expect not in seen:
        listed = ", ".join(sorted(seen)) or "nothing"
        return f"'{example.text}' fires without '{example.expect}'; found were {listed}", False
    return "", False
