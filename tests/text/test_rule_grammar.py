"""Conditions, equations and flags: text to records, and the errors of what does not fit."""

from __future__ import annotations

import math

import msgspec
import pytest
from rdflib import Graph

from carboy.errors import RuleError
from carboy.model.rule import (
    Bound,
    Condition,
    Earlier,
    Flag,
    Measured,
    Meeting,
    Place,
    Present,
    Reaction,
    ReactionTerm,
    Vessel,
)
from carboy.text.rule_grammar import parse_condition, parse_conditions, parse_flag, parse_reaction
from carboy.text.rule_printer import condition_text, flag_text, reaction_text

INF = math.inf

CONDITIONS: list[tuple[str, Condition]] = [
    ("?s is sulfide", Bound("?s", ("sulfide",))),
    ("?s is sulfide or selenide, dissolved", Bound("?s", ("sulfide", "selenide"), where="dissolved")),
    ("?o is oxidiser but not nitrate", Bound("?o", ("oxidiser",), ("nitrate",))),
    ("?o is oxidiser but not nitrate or HNO2, reachable", Bound("?o", ("oxidiser",), ("nitrate", "HNO2"), "reachable")),
    ("?o is ClO-", Bound("?o", ("ClO-",))),
    ("?f is Fe(CN)6-3", Bound("?f", ("Fe(CN)6-3",))),
    ("?a is acetic-acid, liquid", Bound("?a", ("acetic-acid",), where="liquid")),
    ("H2O2 present", Present("H2O2")),
    ("NO present, gas", Present("NO", where="gas")),
    ("PH3 present", Present("PH3")),
    ("no H2O2", Present("H2O2", negated=True)),
    ("no 2-propanol", Present("2-propanol", negated=True)),
    ("no sulfide, dissolved", Present("sulfide", negated=True, where="dissolved")),
    ("temperature-sensitive-solid present", Present("temperature-sensitive-solid")),
    ("?a meets ?b", Meeting("?a", "?b")),
    ("pH below 9", Measured("pH", "below", -INF, 9.0)),
    ("pH   at  least -1", Measured("pH", "at least", -1.0, INF)),
    ("pH between 5 and 8", Measured("pH", "between", 5.0, 8.0)),
    ("temperature above 60 degC", Measured("temperature", "above", 60.0, INF)),
    ("temperature at most 300 K", Measured("temperature", "at most", -INF, 26.85)),
    ("temperature between 30 and 40 degC", Measured("temperature", "between", 30.0, 40.0)),
    ("temperature between 30 degC and 313.15 K", Measured("temperature", "between", 30.0, 40.0)),
    ("strength of ?x above 6 M", Measured("strength", "above", 6.0, INF, "?x")),
    ("strength of ?x above 6 mol/L", Measured("strength", "above", 6.0, INF, "?x")),
    ("strength of HS- below 33 mM", Measured("strength", "below", -INF, 0.033, "HS-")),
    ("strength of acid below 33 mmol/L", Measured("strength", "below", -INF, 0.033, "acid")),
    ("mass fraction of ?x above 30 %", Measured("mass fraction", "above", 0.3, INF, "?x")),
    ("mass fraction of ?x above 30%", Measured("mass fraction", "above", 0.3, INF, "?x")),
    ("mass fraction of ?x above 0.3", Measured("mass fraction", "above", 0.3, INF, "?x")),
    ("water fraction below 7 %", Measured("water fraction", "below", -INF, 0.07)),
    ("water fraction between 10 and 20 %", Measured("water fraction", "between", 0.1, 0.2)),
    ("amount of ?x above 1 mmol", Measured("amount", "above", 0.001, INF, "?x")),
    ("amount of ?x above 2 mol", Measured("amount", "above", 2.0, INF, "?x")),
    ("mass of ?x above 250 mg", Measured("mass", "above", 0.25, INF, "?x")),
    ("mass of ?x above 2 kg", Measured("mass", "above", 2000.0, INF, "?x")),
    ("mass of ?x above 2 g", Measured("mass", "above", 2.0, INF, "?x")),
    ("ratio of ?a to ?b above 1.5", Measured("ratio", "above", 1.5, INF, "?a", "?b")),
    ("ratio of ClO- to NH4+ between 1 and 2", Measured("ratio", "between", 1.0, 2.0, "ClO-", "NH4+")),
    ("headspace below 50 mL", Measured("headspace", "below", -INF, 0.05)),
    ("headspace below 1 L", Measured("headspace", "below", -INF, 1.0)),
    ("ionic strength above 1 mol/kg", Measured("ionic strength", "above", 1.0, INF)),
    ("oxidation state of ?m is 2", Measured("property", "between", 2.0, 2.0, "?m", "oxidation state")),
    ("charge of ?x is -1", Measured("property", "between", -1.0, -1.0, "?x", "charge")),
    ("carbons of ?x at least 4", Measured("property", "at least", 4.0, INF, "?x", "carbons")),
    ("cover is sealed", Vessel("cover", ("sealed",))),
    ("cover is loose or vented", Vessel("cover", ("loose", "vented"))),
    ("cover is not open", Vessel("cover", ("open",), negated=True)),
    ("container is aluminium or brass", Vessel("container", ("aluminium", "brass"))),
    ("container is not HDPE", Vessel("container", ("HDPE",), negated=True)),
    ("earlier ?m is metal-sulfide", Earlier("?m", ("metal-sulfide",))),
    ("earlier ?m is metal-sulfide or HgS", Earlier("?m", ("metal-sulfide", "HgS"))),
]


@pytest.mark.parametrize(("text", "record"), CONDITIONS, ids=[text for text, _ in CONDITIONS])
def test_a_condition_becomes_its_record(text: str, record: Condition) -> None:
    read = parse_condition(text)
    assert read.place == Place("", 1, 1)
    assert msgspec.structs.replace(read, place=None) == record


@pytest.mark.parametrize("text", [text for text, _ in CONDITIONS])
def test_a_printed_condition_reads_back(text: str) -> None:
    read = parse_condition(text)
    assert parse_condition(condition_text(read)) == read


def test_conditions_joined_by_and_keep_the_and_of_between() -> None:
    first, second, third = parse_conditions("pH between 5 and 8 and no H2O2 and ?s is sulfide, solid")
    assert isinstance(first, Measured)
    assert (first.low, first.high) == (5.0, 8.0)
    assert second == Present("H2O2", negated=True, place=Place("", 1, 24))
    assert third == Bound("?s", ("sulfide",), where="solid", place=Place("", 1, 36))


def _term(term: str, coefficient: float | None = 1.0, part: str = "") -> ReactionTerm:
    return ReactionTerm(term, part, coefficient)


REACTIONS: list[tuple[str, Reaction]] = [
    (
        "4 ClO- + HS- -> SO4-2 + 4 Cl- + H+",
        Reaction(
            (_term("ClO-", 4.0), _term("HS-")),
            (_term("SO4-2"), _term("Cl-", 4.0), _term("H+")),
            False,
            "4 ClO- + HS- -> SO4-2 + 4 Cl- + H+",
        ),
    ),
    (
        "?m + H+ ->   ?m.ion + H2, balanced",
        Reaction(
            (_term("?m", None), _term("H+", None)),
            (_term("?m", None, "ion"), _term("H2", None)),
            True,
            "?m + H+ -> ?m.ion + H2",
        ),
    ),
    (
        "A + 1/2 O2 -> B, balanced when pH above 8 and no H2O2, share 0.3 to 1",
        Reaction(
            (_term("A", None), _term("O2", 0.5)),
            (_term("B", None),),
            True,
            "A + 1/2 O2 -> B",
            (Measured("pH", "above", 8.0, INF), Present("H2O2", negated=True)),
            (0.3, 1.0),
        ),
    ),
    (
        "metacinnabar + H2S(g) -> acetic-acid, share 0 to 0.5 when no sulfide, dissolved",
        Reaction(
            (_term("metacinnabar"), _term("H2S(g)")),
            (_term("acetic-acid"),),
            False,
            "metacinnabar + H2S(g) -> acetic-acid",
            (Present("sulfide", negated=True, where="dissolved"),),
            (0.0, 0.5),
        ),
    ),
]


@pytest.mark.parametrize(("text", "record"), REACTIONS, ids=[text for text, _ in REACTIONS])
def test_an_equation_becomes_its_record(text: str, record: Reaction) -> None:
    read = parse_reaction(text)
    when = tuple(msgspec.structs.replace(one, place=None) for one in read.when)
    assert msgspec.structs.replace(read, place=None, when=when) == record
    again = parse_reaction(reaction_text(read))
    again_when = tuple(msgspec.structs.replace(one, place=None) for one in again.when)
    assert msgspec.structs.replace(again, place=None, when=again_when) == record


FLAGS: list[tuple[str, Flag]] = [
    ("flammable-gas of H2", Flag("flammable-gas", ("H2",))),
    ("heat", Flag("heat")),
    ("toxic-gas of Cl2 and ClO2", Flag("toxic-gas", ("Cl2", "ClO2"))),
    ("remobilised of ?m.metal", Flag("remobilised", ("?m.metal",))),
    (
        'explosive of "organic  peroxides" weighed by ?p at most warning moment storage when temperature above 40 degC',
        Flag(
            "explosive",
            (),
            "organic peroxides",
            "?p",
            "warning",
            "storage",
            (Measured("temperature", "above", 40.0, INF),),
        ),
    ),
]


@pytest.mark.parametrize(("text", "record"), FLAGS, ids=[text for text, _ in FLAGS])
def test_a_flag_becomes_its_record(text: str, record: Flag) -> None:
    read = parse_flag(text)
    when = tuple(msgspec.structs.replace(one, place=None) for one in read.when)
    assert msgspec.structs.replace(read, place=None, when=when) == record
    again = parse_flag(flag_text(read))
    again_when = tuple(msgspec.structs.replace(one, place=None) for one in again.when)
    assert msgspec.structs.replace(again, place=None, when=again_when) == record


@pytest.mark.parametrize(
    ("text", "start", "words", "suggestions"),
    [
        ("pH belw 9", 3, "'above', 'below', 'between', 'at least' or 'at most' was expected", ("below",)),
        ("pH below nine", 9, "a number was expected, but 'nine' stands there", ()),
        ("strength of ?x above 6 g", 23, "a unit of strength (mol/L, mmol/L, mM, M) was expected", ()),
        ("amount of ?x above 6 mmoll", 21, "a unit of amount (mmol, mol) was expected", ("mmol", "mol")),
        ("temperature above 60 C", 21, "a unit of temperature (degC, K) was expected", ()),
        ("?s is", 5, "a class, a species or a substance was expected, but the line ends there", ()),
        ("?s iss sulfide", 3, "'is' or 'meets' was expected", ("is",)),
        (
            "?s is sulfide, disolved",
            15,
            "'dissolved', 'solid', 'gas', 'liquid' or 'reachable' was expected",
            ("dissolved",),
        ),
        ("?s is sulfide dissolved", 14, "the end was expected, but 'dissolved' stands there", ()),
        ("?S is sulfide", 0, "a condition was expected, but '?S' stands there", ()),
        ("temprature above 60 degC", 0, "a condition was expected", ("temperature",)),
        ("cover is seald", 9, "'open', 'loose', 'vented' or 'sealed' was expected", ("sealed",)),
        ("pH between 9 and 8", 0, "the window is empty", ()),
        ("ratio of ?a above 2", 12, "'to' was expected", ()),
        ("", 0, "a condition was expected, but the line ends there", ()),
    ],
)
def test_a_condition_that_does_not_fit_says_where_and_what(
    text: str, start: int, words: str, suggestions: tuple[str, ...]
) -> None:
    with pytest.raises(RuleError) as caught:
        parse_condition(text)
    assert words in caught.value.message
    assert caught.value.span is not None
    assert caught.value.span.start == start
    assert caught.value.suggestions == suggestions


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("A + -> B", "a variable, a part of one, a species or a substance was expected, but '->' stands there"),
        ("A B -> C", "'->' or ' + ' was expected, but 'B' stands there"),
        ("A -> B, share 1 to 0.5", "a share of conversion goes from a lower to a higher number"),
        ("A -> B, balanced, balanced", "'balanced' stands here twice"),
        ("?m -> ?m.iom", "'.iom' is no part of a thing; the parts are ion, acid, anion, metal, oxidised, reduced"),
        ("A -> B, shar 0 to 1", "'balanced' or 'share' was expected"),
    ],
)
def test_an_equation_that_does_not_fit(text: str, words: str) -> None:
    with pytest.raises(RuleError, match="column"):
        parse_reaction(text)
    with pytest.raises(RuleError) as caught:
        parse_reaction(text)
    assert words in caught.value.message


@pytest.mark.parametrize(
    ("text", "words", "suggestions"),
    [
        ("toxicgas of Cl2", "a kind of hazard was expected, but 'toxicgas' stands there", ("toxic-gas",)),
        ("heat at most wrning", "'danger', 'warning' or 'note' was expected", ("warning",)),
        ("heat at most note at most note", "'at most' stands here twice", ()),
        ('fire of "one" and "two"', "a flag holds one text in quotes", ()),
    ],
)
def test_a_flag_that_does_not_fit(text: str, words: str, suggestions: tuple[str, ...]) -> None:
    with pytest.raises(RuleError) as caught:
        parse_flag(text)
    assert words in caught.value.message
    assert caught.value.suggestions == suggestions


def test_the_grammar_leaves_the_sparql_parser_of_rdflib_alone() -> None:
    parse_flag("heat")
    parse_reaction("A -> B")
    parse_condition("pH below 9")
    graph = Graph()
    graph.parse(data='@prefix : <urn:x:> . :a :gives :b ; :name "one" . :c :gives :d .', format="turtle")
    rows = list(
        graph.query(
            """
            PREFIX : <urn:x:>
            SELECT ?what ?name
            WHERE {
                ?what :gives ?gas .
                OPTIONAL { ?what :name ?name }
            }
            ORDER BY ?what
            """
        )
    )
    assert [(str(row[0]), str(row[1])) for row in rows] == [("urn:x:a", "one"), ("urn:x:c", "None")]
