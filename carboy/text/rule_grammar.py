"""Pyparsing grammar of what stands in the clauses of a rule: conditions, equations, flags.

Each ``parse_*`` function takes the text of one item on one line and returns a record of :mod:`carboy.model.rule`. The
places in those records are places in that text (line 1, column from 1); :mod:`carboy.text.rule_reader` moves them into
the file.
A text that does not fit raises RuleError with a Span of that text and suggestions.

rdflib parses SPARQL with pyparsing in the same process, so no class-level option of pyparsing is set here.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Sequence
from decimal import Decimal
from fractions import Fraction
from functools import cache
from typing import Any, get_args

import pyparsing as pp
from rapidfuzz import fuzz, process

from carboy.errors import RuleError
from carboy.model.rule import (
    Bound,
    Condition,
    Earlier,
    Flag,
    Kind,
    Measured,
    Meeting,
    Place,
    Present,
    Reaction,
    ReactionTerm,
    Vessel,
    Where,
)
from carboy.span import Span

PARTS = ("ion", "acid", "anion", "metal", "oxidised", "reduced")
COVERS = ("open", "loose", "vented", "sealed")
MOMENTS = ("contact", "during", "after", "storage")
GRADES = ("danger", "warning", "note")
KINDS: tuple[str, ...] = get_args(Kind)
WHERES: tuple[str, ...] = tuple(word for word in get_args(Where) if word != "any")

# Unit -> (factor, offset) to the unit that model/rule.py fixes for the quantity.
# Decimal, so that a printed rule reads back exactly.
_UNITS: dict[str, dict[str, tuple[Decimal, Decimal]]] = {
    "temperature": {"degC": (Decimal(1), Decimal(0)), "K": (Decimal(1), Decimal("-273.15"))},
    "strength": {
        "mol/L": (Decimal(1), Decimal(0)),
        "mmol/L": (Decimal("0.001"), Decimal(0)),
        "mM": (Decimal("0.001"), Decimal(0)),
        "M": (Decimal(1), Decimal(0)),
    },
    "ionic strength": {"mol/kg": (Decimal(1), Decimal(0))},
    "headspace": {"mL": (Decimal("0.001"), Decimal(0)), "L": (Decimal(1), Decimal(0))},
    "amount": {"mmol": (Decimal("0.001"), Decimal(0)), "mol": (Decimal(1), Decimal(0))},
    "mass": {
        "mg": (Decimal("0.001"), Decimal(0)),
        "kg": (Decimal(1000), Decimal(0)),
        "g": (Decimal(1), Decimal(0)),
    },
}
_PER_CENT = Decimal("0.01")

# What the reader expected, in the words of the message -> the words that may stand there.
_EXPECTED: dict[str, Sequence[str]] = {}

_CONDITION_WORDS = (
    "pH", "temperature", "strength of", "mass fraction of", "amount of", "mass of", "ratio of",
    "water fraction", "headspace", "ionic strength", "oxidation state of", "charge of", "carbons of",
    "cover", "container", "earlier", "no",
)  # fmt: skip

_NOT_NAMES = (
    r"(?!(?:is|or|and|but|not|of|to|when|weighed|at|moment|present|share|balanced|meets|above|below|between)"
    r"(?:[\s,]|$))"
)
_NAME = _NOT_NAMES + r"(?=[^\s,]*[A-Za-z])[A-Za-z0-9\[(][A-Za-z0-9()\[\]·.+'-]*"


def closest(word: str, choices: Sequence[str], *, limit: int = 3, least: float = 62) -> tuple[str, ...]:
    """The words of ``choices`` most like ``word``, best first; none whose likeness is below ``least`` per cent."""
    found = process.extract(word, sorted(set(choices)), scorer=fuzz.ratio, score_cutoff=least, limit=limit)
    return tuple(choice for choice, _, _ in found)


def _expected(element: pp.ParserElement, words: str, choices: Sequence[str] = ()) -> pp.ParserElement:
    _EXPECTED[words] = choices
    return element.set_name(words)


def _word(text: str) -> pp.ParserElement:
    """A keyword, possibly of several words with any space between them."""
    parts: list[pp.ParserElement] = [
        pp.Regex(rf"{re.escape(part)}(?![A-Za-z0-9_+()\[\]·.?-])").set_name(f"'{part}'") for part in text.split()
    ]
    return pp.And(parts) if len(parts) > 1 else parts[0]


def _one_of(words: Sequence[str]) -> pp.ParserElement:
    return pp.MatchFirst([_word(word) for word in words])


def _place(location: int) -> Place:
    return Place(file="", line=1, column=location + 1)


def _acted(element: pp.ParserElement, build: Callable[[int, Any], Any]) -> pp.ParserElement:
    """``element`` whose match becomes the one record that ``build(location, tokens)`` gives."""

    def action(_text: str, location: int, tokens: pp.ParseResults) -> list[Any]:
        return [build(location, tokens)]

    return element.add_parse_action(action)


def _number() -> pp.ParserElement:
    element = pp.Regex(r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?(?![\d.])")
    return _expected(_acted(element, lambda _, tokens: Decimal(tokens[0])), "a number")


def _unit(quantity: str) -> pp.ParserElement:
    names = tuple(_UNITS[quantity])
    element = pp.Regex(f"(?:{'|'.join(names)})(?![A-Za-z/])")
    return _expected(element, f"a unit of {quantity} ({', '.join(names)})", names)


def _to_standard(quantity: str, number: Decimal, unit: str) -> float:
    factor, offset = _UNITS[quantity][unit]
    return float(number * factor + offset)


def _comparison(value: pp.ParserElement, finish: Callable[[Any], float]) -> pp.ParserElement:
    """``above 3 M``, ``between 1 and 2 mol``...: gives (compare, low, high); one-sided windows end in an infinity."""
    one = _acted(value.copy(), lambda _, tokens: tuple(tokens))
    # of `between 5 and 8 mM` the first number may go without its unit and then takes that of the second
    above = _acted(_word("above") - one, lambda _, t: ("above", finish(t[1]), math.inf))
    below = _acted(_word("below") - one, lambda _, t: ("below", -math.inf, finish(t[1])))
    at_least = _acted(_word("least") - one, lambda _, t: ("at least", finish(t[1]), math.inf))
    at_most = _acted(_word("most") - one, lambda _, t: ("at most", -math.inf, finish(t[1])))
    at = pp.Suppress(_word("at")) - _expected(at_least | at_most, "'least' or 'most'", ("least", "most"))
    bare = _acted(_number() + pp.FollowedBy(_word("and")), lambda _, tokens: tuple(tokens))

    def ends(_: int, tokens: Any) -> tuple[str, float, float]:
        lower, upper = tokens[1], tokens[3]
        if len(lower) < len(upper):
            lower = (*lower, *upper[len(lower) :])
        return ("between", finish(lower), finish(upper))

    between = _acted(_word("between") - (bare | one) - _word("and") - one, ends)
    return _expected(
        above | below | between | at,
        "'above', 'below', 'between', 'at least' or 'at most'",
        ("above", "below", "between", "at least", "at most"),
    )


def _with_unit(quantity: str) -> pp.ParserElement:
    return _comparison(_number() - _unit(quantity), lambda pair: _to_standard(quantity, pair[0], pair[1]))


def _plain() -> pp.ParserElement:
    return _comparison(_number(), lambda pair: float(pair[0]))


def _fraction() -> pp.ParserElement:
    """``30 %`` or ``0.3``."""
    return _comparison(
        _number() + pp.Opt(pp.Literal("%")), lambda pair: float(pair[0] * _PER_CENT if len(pair) > 1 else pair[0])
    )


@cache
def _variable() -> pp.ParserElement:
    return _expected(pp.Regex(r"\?[a-z][a-z0-9_]*(?![A-Za-z0-9_-])"), "a variable such as ?s")


@cache
def _name() -> pp.ParserElement:
    return _expected(pp.Regex(_NAME), "a class, a species or a substance")


@cache
def _term() -> pp.ParserElement:
    """A variable or a name."""
    return _expected(_variable() | _name(), "a variable, a species or a substance")


@cache
def _subject() -> pp.ParserElement:
    """A variable, perhaps with a part of it (``?m.ion``), or a name."""

    def known(text: str, location: int, tokens: pp.ParseResults) -> None:
        _, part = _split_part(tokens[0])
        if part and part not in PARTS:
            raise pp.ParseFatalException(
                text, location, f"'.{part}' is no part of a thing; the parts are {', '.join(PARTS)}"
            )

    variable = pp.Regex(r"\?[a-z][a-z0-9_]*(?:\.[a-z]+)?(?![A-Za-z0-9_.-])").add_parse_action(known)
    return _expected(variable | _name(), "a variable, a part of one, a species or a substance")


def _alternatives(item: pp.ParserElement) -> pp.ParserElement:
    """``a or b or c``, as one tuple."""
    return _acted(item + pp.ZeroOrMore(pp.Suppress(_word("or")) - item), lambda _, tokens: tuple(tokens))


def _where() -> pp.ParserElement:
    word = _expected(_one_of(WHERES), "'dissolved', 'solid', 'gas', 'liquid' or 'reachable'", WHERES)
    # the comma may also begin ', share' or ', balanced' of an equation
    return pp.Opt(pp.Suppress(",") + ~_one_of(("share", "balanced")) - word, default="any")


@cache
def _condition() -> pp.ParserElement:
    variable, name = _variable(), _name()
    names = _alternatives(name)

    but_not = pp.Opt(pp.Suppress(_word("but") - _word("not")) - names, default=())
    bound_tail = _acted(pp.Suppress(_word("is")) - names + but_not + _where(), lambda _, t: ("is", t[0], t[1], t[2]))
    meets_tail = _acted(pp.Suppress(_word("meets")) - variable, lambda _, t: ("meets", t[0]))
    tail = _expected(bound_tail | meets_tail, "'is' or 'meets'", ("is", "meets"))

    def about_variable(location: int, tokens: Any) -> Condition:
        subject, (verb, *rest) = tokens[0], tokens[1]
        if verb == "meets":
            return Meeting(subject, rest[0], place=_place(location))
        return Bound(subject, rest[0], rest[1], rest[2], place=_place(location))

    of = pp.Suppress(_word("of")) - _term()

    def measured(
        words: str, window: pp.ParserElement, *, subject: bool = False, quantity: str = ""
    ) -> pp.ParserElement:
        head = pp.Suppress(_word(words)) - of if subject else pp.Suppress(_word(words))

        def build(location: int, tokens: Any) -> Condition:
            compare, low, high = tokens[-1]
            if low > high:
                raise pp.ParseFatalException("", location, "the window is empty: its lower end is above its upper end")
            return Measured(quantity or words, compare, low, high, tokens[0] if subject else "", place=_place(location))

        return _acted(head - window, build)

    def ratio(location: int, tokens: Any) -> Condition:
        compare, low, high = tokens[2]
        return Measured("ratio", compare, low, high, tokens[0], tokens[1], place=_place(location))

    def property_of(location: int, tokens: Any) -> Condition:
        words, subject, (compare, low, high) = tokens
        return Measured("property", compare, low, high, subject, words, place=_place(location))

    def vessel(about: str, word: pp.ParserElement) -> pp.ParserElement:
        negation = _acted(pp.Opt(_word("not")), lambda _, t: bool(t))
        element = pp.Suppress(_word(about)) - pp.Suppress(_word("is")) - negation - _alternatives(word)
        return _acted(element, lambda location, t: Vessel(about, t[1], t[0], place=_place(location)))  # type: ignore[arg-type]

    equal = _acted(pp.Suppress(_word("is")) - _number(), lambda _, t: ("between", float(t[0]), float(t[0])))
    exactly = _expected(
        equal | _plain(), "'is', 'above', 'below', 'between', 'at least' or 'at most'", ("is", "at least", "at most")
    )
    property_word = _acted(_word("oxidation state") | _word("charge") | _word("carbons"), lambda _, t: " ".join(t))
    earlier = _acted(
        pp.Suppress(_word("earlier")) - variable - pp.Suppress(_word("is")) - names,
        lambda location, t: Earlier(t[0], t[1], place=_place(location)),
    )
    absent = _acted(
        pp.Suppress(_word("no")) - name - _where(),
        lambda location, t: Present(t[0], True, t[1], place=_place(location)),
    )
    present = _acted(
        name + pp.Suppress(_word("present")) - _where(),
        lambda location, t: Present(t[0], False, t[1], place=_place(location)),
    )
    cover = _expected(_one_of(COVERS), "'open', 'loose', 'vented' or 'sealed'", COVERS)
    container = _expected(pp.Regex(_NAME), "a container material")
    return _expected(
        pp.MatchFirst(
            [
                _acted(variable - tail, about_variable),
                measured("pH", _plain()),
                measured("temperature", _with_unit("temperature")),
                measured("water fraction", _fraction()),
                measured("ionic strength", _with_unit("ionic strength")),
                measured("headspace", _with_unit("headspace")),
                measured("strength", _with_unit("strength"), subject=True),
                measured("mass fraction", _fraction(), subject=True),
                measured("amount", _with_unit("amount"), subject=True),
                measured("mass", _with_unit("mass"), subject=True),
                _acted(pp.Suppress(_word("ratio")) - of - pp.Suppress(_word("to")) - _term() - _plain(), ratio),
                _acted(property_word - of - exactly, property_of),
                vessel("cover", cover),
                vessel("container", container),
                earlier,
                absent,
                present,
            ]
        ),
        "a condition",
        _CONDITION_WORDS,
    )


def _conditions() -> pp.ParserElement:
    condition = _condition()
    return _acted(condition + pp.ZeroOrMore(pp.Suppress(_word("and")) - condition), lambda _, t: tuple(t))


@cache
def _reaction() -> pp.ParserElement:
    coefficient = _acted(
        pp.Regex(r"\d+(?:\.\d+)?(?:/[1-9]\d*)?(?=\s)"),
        lambda _, t: float(Fraction(t[0].split("/")[0]) / _denominator(t[0])),
    )

    def term(_: int, tokens: Any) -> ReactionTerm:
        amount, subject = (tokens[0], tokens[1]) if len(tokens) == 2 else (None, tokens[0])
        base, part = _split_part(subject)
        return ReactionTerm(base, part, amount)

    one_term = _expected(_acted(pp.Opt(coefficient) + _subject(), term), "a term of the equation")
    side = _acted(one_term + pp.ZeroOrMore(pp.Suppress(_word("+")) - one_term), lambda _, t: tuple(t))
    arrow = _expected(pp.Suppress("->"), "'->' or ' + '")
    share = _acted(
        pp.Suppress(_word("share")) - _number() - pp.Suppress(_word("to")) - _number(),
        lambda location, t: ("share", _share(location, t[0], t[1])),
    )
    balanced = _acted(pp.Suppress(_word("balanced")), lambda _, _t: ("balanced", True))
    after_comma = pp.Suppress(",") - _expected(balanced | share, "'balanced' or 'share'", ("balanced", "share"))
    when = _acted(pp.Suppress(_word("when")) - _conditions(), lambda _, t: ("when", t[0]))

    here = pp.Empty().leave_whitespace().add_parse_action(lambda _text, location, _tokens: location)

    def build(text: str, location: int, tokens: pp.ParseResults) -> list[Reaction]:
        reactants, products, end, *rest = tokens
        options = _once(location, rest)
        balance = bool(options.get("balanced", False))
        if not balance:
            reactants, products = (tuple(_counted(one) for one in terms) for terms in (reactants, products))
        written = " ".join(text[location:end].split())
        when, share = options.get("when", ()), options.get("share", (1.0, 1.0))
        return [Reaction(reactants, products, balance, written, when, share, place=_place(location))]

    return (side - arrow - side + here + pp.ZeroOrMore(after_comma | when)).add_parse_action(build)


@cache
def _flag() -> pp.ParserElement:
    words = _acted(pp.QuotedString('"'), lambda _, t: ("words", t[0]))
    subject = _acted(_subject().copy(), lambda _, t: ("term", t[0]))
    thing = _expected(words | subject, 'a species, a variable or "words"')
    separator = pp.Suppress(pp.Literal(",") | _word("and") | _word("or"))
    of = _acted(pp.Suppress(_word("of")) - thing + pp.ZeroOrMore(separator - thing), lambda _, t: ("of", tuple(t)))
    weighed = _acted(pp.Suppress(_word("weighed") - _word("by")) - _term(), lambda _, t: ("weighed by", t[0]))
    grade = _expected(_one_of(GRADES), "'danger', 'warning' or 'note'", GRADES)
    at_most = _acted(pp.Suppress(_word("at") - _word("most")) - grade, lambda _, t: ("at most", t[0]))
    moment_word = _expected(_one_of(MOMENTS), "'contact', 'during', 'after' or 'storage'", MOMENTS)
    moment = _acted(pp.Suppress(_word("moment")) - moment_word, lambda _, t: ("moment", t[0]))
    when = _acted(pp.Suppress(_word("when")) - _conditions(), lambda _, t: ("when", t[0]))
    kind = _expected(_one_of(KINDS), "a kind of hazard", KINDS)

    def build(location: int, tokens: Any) -> Flag:
        options = _once(location, tokens[1:])
        things = options.get("of", ())
        quoted = [text for sort, text in things if sort == "words"]
        if len(quoted) > 1:
            raise pp.ParseFatalException("", location, "a flag holds one text in quotes")
        return Flag(
            tokens[0],
            tuple(text for sort, text in things if sort == "term"),
            " ".join(quoted[0].split()) if quoted else "",
            options.get("weighed by", ""),
            options.get("at most", ""),
            options.get("moment", ""),
            options.get("when", ()),
            place=_place(location),
        )

    return _acted(kind + pp.ZeroOrMore(of | weighed | at_most | moment | when), build)


def _denominator(text: str) -> int:
    return int(text.split("/")[1]) if "/" in text else 1


def _counted(term: ReactionTerm) -> ReactionTerm:
    """In an equation that is not to be balanced a term without a coefficient has 1."""
    return term if term.coefficient is not None else ReactionTerm(term.term, term.part, 1.0)


def _split_part(subject: str) -> tuple[str, str]:
    if subject.startswith("?") and "." in subject:
        base, _, part = subject.partition(".")
        return base, part
    return subject, ""


def _share(location: int, low: Decimal, high: Decimal) -> tuple[float, float]:
    if not 0 <= low <= high <= 1:
        raise pp.ParseFatalException(
            "", location, "a share of conversion goes from a lower to a higher number, both from 0 to 1"
        )
    return float(low), float(high)


def _once(location: int, options: Sequence[tuple[str, Any]]) -> dict[str, Any]:
    found: dict[str, Any] = {}
    for key, value in options:
        if key in found:
            raise pp.ParseFatalException("", location, f"'{key}' stands here twice")
        found[key] = value
    return found


def _parse(element: pp.ParserElement, text: str) -> Any:
    """The one record that the whole of ``text`` gives; RuleError where it does not fit."""
    end = _expected(pp.StringEnd(), "the end")
    whole = (element + end).parse_with_tabs()
    try:
        return whole.parse_string(text)[0]
    except pp.ParseBaseException as error:
        raise _rule_error(text, error) from None


def _rule_error(text: str, error: pp.ParseBaseException) -> RuleError:
    start = error.loc
    while start < len(text) and text[start].isspace():
        start += 1
    end = start
    while (end < len(text) and not (text[end].isspace() or text[end] in ",|")) or end == start < len(text):
        end += 1
    found = text[start:end]
    expected = error.msg.removeprefix("Expected ").strip()
    if not error.msg.startswith("Expected "):
        return RuleError(error.msg, span=Span(text, start, end))
    saw = f"'{found}' stands there" if found else "the line ends there"
    if expected == "'present'":  # the last alternative of a condition: it was no name but a misspelt first word
        end = len(text[:start].rstrip())
        start = text.rfind(" ", 0, end) + 1
        found, expected = text[start:end], "a condition"
        saw = f"'{found}' stands there without 'present' or 'no'"
    choices = _EXPECTED.get(expected, ())
    return RuleError(
        f"{expected} was expected, but {saw}",
        span=Span(text, start, end),
        suggestions=closest(found, choices) if found else (),
    )


def parse_condition(text: str) -> Condition:
    """One condition of ``needs``, such as ``?s is sulfide, dissolved``. Raises RuleError."""
    return _parse(_condition(), text)


def parse_conditions(text: str) -> tuple[Condition, ...]:
    """Conditions joined by ``and``. Raises RuleError."""
    return _parse(_conditions(), text)


def parse_reaction(text: str) -> Reaction:
    """One ``does`` line. Raises RuleError."""
    return _parse(_reaction(), text)


def parse_flag(text: str) -> Flag:
    """One ``flags`` line. Raises RuleError."""
    return _parse(_flag(), text)
