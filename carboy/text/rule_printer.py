"""A rule record as source text in one canonical layout; reading it back gives the same record, places apart."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable
from decimal import Decimal

import msgspec

from carboy.model.rule import (
    Bound,
    Condition,
    Earlier,
    Example,
    Flag,
    Measured,
    Meeting,
    Present,
    Reaction,
    ReactionTerm,
    Rule,
    Vessel,
)

_INDENT = "  "
_COLUMN = 10  # where the text of a clause begins
_WIDTH = 118
# the unit that model/rule.py fixes for each quantity
_UNIT = {
    "temperature": " degC",
    "strength": " M",
    "ionic strength": " mol/kg",
    "headspace": " L",
    "amount": " mol",
    "mass": " g",
}
_FRACTIONS = ("water fraction", "mass fraction")


def number_text(value: float) -> str:
    """A number as the language writes it; reads back to the same float."""
    return str(int(value)) if value == int(value) and abs(value) < 1e15 else repr(value)


def rule_text(rule: Rule) -> str:
    """The rule as canonical source, ending with a line break."""
    lines = [f"rule {rule.id}"]

    def clause(word: str, items: Iterable[str]) -> None:
        first = True
        for item in items:
            head = f"{_INDENT}{word}" if first or word in ("fires", "silent") else ""
            lines.extend(_wrapped(head, item))
            first = False

    clause("title", [rule.title] if rule.title else [])
    clause("needs", map(condition_text, rule.needs))
    clause("does", map(reaction_text, rule.does))
    clause("speed", [rule.speed])
    clause("flags", map(flag_text, rule.flags))
    clause("moment", [rule.moment] if rule.moment else [])
    clause("says", [rule.says] if rule.says else [])
    clause("guard", rule.guard)
    clause("cites", [", ".join(rule.cites)] if rule.cites else [])
    clause("fires", (example.text for example in rule.fires))
    clause("silent", (example.text for example in rule.silent))
    clause("off", [rule.off] if rule.off else [])
    return "\n".join(lines) + "\n"


def _wrapped(head: str, item: str) -> list[str]:
    """One item; what goes over the width stands deeper than the item. A title stays on its line."""
    first = head.ljust(_COLUMN)
    if head.strip() == "title":
        return [first + item]
    deeper = " " * (_COLUMN + 2)
    return textwrap.wrap(
        item, _WIDTH, initial_indent=first, subsequent_indent=deeper, break_long_words=False, break_on_hyphens=False
    )


def condition_text(condition: Condition) -> str:
    """One condition as it is written in ``needs``."""
    match condition:
        case Bound(variable=variable, classes=classes, but_not=but_not, where=where):
            excluded = f" but not {' or '.join(but_not)}" if but_not else ""
            return f"{variable} is {' or '.join(classes)}{excluded}{_place_text(where)}"
        case Present(term=term, negated=True, where=where):
            return f"no {term}{_place_text(where)}"
        case Present(term=term, where=where):
            return f"{term} present{_place_text(where)}"
        case Vessel(about=about, words=words, negated=negated):
            return f"{about} is {'not ' if negated else ''}{' or '.join(words)}"
        case Earlier(variable=variable, classes=classes):
            return f"earlier {variable} is {' or '.join(classes)}"
        case Meeting(first=first, second=second):
            return f"{first} meets {second}"
        case Measured(quantity="property", term=term, other=words, low=low, high=high) if low == high:
            return f"{words} of {term} is {number_text(low)}"
        case Measured(quantity=quantity, term=term, other=other):
            return f"{_quantity_text(quantity, term, other)} {_window_text(condition)}"
    raise AssertionError(f"no text for {condition!r}")


def _place_text(where: str) -> str:
    return "" if where == "any" else f", {where}"


def _quantity_text(quantity: str, term: str, other: str) -> str:
    if quantity == "property":
        return f"{other} of {term}"
    if quantity == "ratio":
        return f"ratio of {term} to {other}"
    return f"{quantity} of {term}" if term else quantity


def _window_text(measured: Measured) -> str:
    def value(number: float) -> str:
        if measured.quantity in _FRACTIONS:
            percent = (Decimal(repr(number)) * 100).normalize()
            return f"{percent:f} %"
        return number_text(number) + _UNIT.get(measured.quantity, "")

    if measured.compare == "between":
        return f"between {value(measured.low)} and {value(measured.high)}"
    return f"{measured.compare} {value(measured.low if measured.compare in ('above', 'at least') else measured.high)}"


def term_text(term: ReactionTerm, *, balance: bool = False) -> str:
    """One term of an equation. A coefficient of 1 is left out unless it was written in an equation to ``balance``."""
    subject = f"{term.term}.{term.part}" if term.part else term.term
    amount = term.coefficient
    if amount is None or (amount == 1.0 and not balance):
        return subject
    return f"{number_text(amount)} {subject}"


def equation_text(reaction: Reaction) -> str:
    """``2 A + B -> C``."""
    sides = (reaction.reactants, reaction.products)
    left, right = (" + ".join(term_text(term, balance=reaction.balance) for term in side) for side in sides)
    return f"{left} -> {right}"


def reaction_text(reaction: Reaction) -> str:
    """One ``does`` line, with its equation as it was written."""
    text = reaction.text or equation_text(reaction)
    if reaction.balance:
        text += ", balanced"
    if reaction.when:
        text += f" when {' and '.join(map(condition_text, reaction.when))}"
    if reaction.share != (1.0, 1.0):
        text += f", share {number_text(reaction.share[0])} to {number_text(reaction.share[1])}"
    return text


def flag_text(flag: Flag) -> str:
    """One ``flags`` line."""
    things = [*flag.terms, *([f'"{flag.words}"'] if flag.words else [])]
    text: str = flag.kind
    if things:
        text += f" of {' and '.join(things)}"
    if flag.weighed_by:
        text += f" weighed by {flag.weighed_by}"
    if flag.grade:
        text += f" at most {flag.grade}"
    if flag.moment:
        text += f" moment {flag.moment}"
    if flag.when:
        text += f" when {' and '.join(map(condition_text, flag.when))}"
    return text


def without_places(rule: Rule) -> Rule:
    """The same rule with every place left out, to compare two rules by what they say."""

    def conditions(given: tuple[Condition, ...]) -> tuple[Condition, ...]:
        return tuple(msgspec.structs.replace(one, place=None) for one in given)

    def examples(given: tuple[Example, ...]) -> tuple[Example, ...]:
        return tuple(msgspec.structs.replace(one, place=None) for one in given)

    return msgspec.structs.replace(
        rule,
        needs=conditions(rule.needs),
        does=tuple(msgspec.structs.replace(one, when=conditions(one.when), place=None) for one in rule.does),
        flags=tuple(msgspec.structs.replace(one, when=conditions(one.when), place=None) for one in rule.flags),
        fires=examples(rule.fires),
        silent=examples(rule.silent),
        place=None,
    )
