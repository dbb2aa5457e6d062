"""The linter against a small graph: each fault has a broken rule with its messages beside it."""

from __future__ import annotations

from collections.abc import Collection, Iterable
from pathlib import Path

import pytest

from carboy.chemistry.relations import part_of
from carboy.chemistry.stock import ChemicalStock
from carboy.errors import InputError
from carboy.model.plan import Ingredient, Interval, Portion
from carboy.model.rule import Example, Rule
from carboy.rulebook.examples import Runner, portion_words, run_examples
from carboy.rulebook.lint import lint_rules
from carboy.text.rule_reader import read_rule_files, read_rules
from tests.rulebook.small_index import small_index

BROKEN = Path(__file__).parent.parent / "broken" / "rules" / "lint"

SOUND = """\
rule metal-frees-hydrogen
  title   Acid on an active metal
  needs   ?m is active-metal, solid
          pH below 4
  does    ?m + H+ -> ?m.ion + H2, balanced
          ?m + 2 H2O -> ?m.ion + H2 + OH-, balanced when temperature above 80 degC
  flags   flammable-gas of H2
          attack of brass weighed by metal-ion when container is brass or polyethylene
  says    The acid dissolves ?m.
  guard   Keep flames away from ?m.
  cites   round-numbers
  fires   5 g of zinc powder + 200 mL of 2 M hydrochloric acid -> H2
          1 g of aluminium + 100 mL of 1 M sulfuric acid
  silent  5 g of copper powder + 200 mL of 2 M hydrochloric acid
          5 g of zinc powder + 200 mL of water
"""


@pytest.mark.parametrize("path", sorted(BROKEN.glob("*.rule")), ids=lambda path: path.stem)
def test_a_broken_rule_gives_the_messages_beside_it(path: Path) -> None:
    rules = read_rule_files([(path.name, path.read_bytes())])
    lines = [f"{problem.severity}: {problem}" for problem in lint_rules(rules, small_index())]
    assert lines == path.with_suffix(".txt").read_text(encoding="utf-8").splitlines()
    assert lines


def test_there_are_broken_rules() -> None:
    assert len(list(BROKEN.glob("*.rule"))) == len(list(BROKEN.glob("*.txt"))) >= 25


def test_a_sound_rule_has_no_problem() -> None:
    # the second branch of aluminium and zinc is balanced with the 2 H2O that is written
    assert lint_rules(read_rules(SOUND), small_index()) == []


def test_ids_are_unique_over_several_books() -> None:
    rules = (*read_rules(SOUND, "a.rule"), *read_rules(SOUND, "b.rule"))
    messages = [problem.message for problem in lint_rules(rules, small_index())]
    assert messages == [
        "there is another rule of this id at a.rule:1",
        "rule 'metal-frees-hydrogen' at a.rule:1 has the same needs and flags",
    ]


def test_names_of_labels_serve_suggestions() -> None:
    rules = read_rules(SOUND.replace("H+ -> ?m.ion + H2,", "muriatic-acid -> ?m.ion + H2,"))
    problems = lint_rules(rules, small_index(), names={"muriatic acid": "substance:hydrogen-peroxide"})
    assert [problem.suggestions[:1] for problem in problems] == [("hydrogen-peroxide",)]


def _read_portion(text: str) -> Portion:
    if "sulfuric" in text:
        raise InputError("nothing is known of this")
    words = text.rsplit(" of ", maxsplit=1)[-1]
    reference = "unrecognised" if "copper" in words else "substance:zinc"
    ingredient = Ingredient(words=words, reference=reference, suggestions=("copper",) if "copper" in words else ())
    return Portion(text=text, amount=Interval(low=1.0, high=1.0), unit="g", ingredients=(ingredient,))


def test_portions_are_read_by_the_reader_that_is_given() -> None:
    problems = lint_rules(read_rules(SOUND), small_index(), parse_portion=_read_portion)
    assert [(problem.message, problem.suggestions) for problem in problems] == [
        ("the portion '100 mL of 1 M sulfuric acid' cannot be read: nothing is known of this", ()),
        ("'copper powder' in the portion '5 g of copper powder' is not in the graph", ("copper",)),
    ]


@pytest.mark.parametrize(
    ("part", "member", "expected"),
    [
        ("ion", "zinc", "Zn+2"),
        ("ion", "copper", None),
        ("metal", "zinc-sulfide", "Zn+2"),
        ("anion", "zinc-sulfide", "HS-"),
        ("metal", "ClO-", None),
        ("acid", "HS-", "H2S"),
        ("acid", "SO4-2", None),
        ("acid", "Zn+2", None),
        ("reduced", "ClO-", None),
    ],
)
def test_parts_come_from_the_graph(part: str, member: str, expected: str | None) -> None:
    assert part_of(member, part, ChemicalStock(small_index())) == expected


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("200 mL of 2 M hydrochloric acid + 5 g of zinc powder", {"hydrochloric", "zinc"}),
        ("1 L of (10-50 g/L copper sulfate in water)", {"copper", "sulfate"}),
        ("250 mL of 2 M NaOH", {"naoh"}),
    ],
)
def test_words_that_make_two_examples_alike(text: str, words: set[str]) -> None:
    (rule,) = read_rules(f"rule one\n  fires   {text}\n")
    assert portion_words(rule.fires[0]) == words


# --- running the examples


def _runner(found: dict[str, tuple[Collection[str], Collection[str]]]) -> Runner:
    """A runner that finds the rule in the examples whose first portion is a key."""

    def run(example: Example) -> Iterable[tuple[str, Collection[str], Collection[str]]]:
        if example.portions[0] == "1 g of trouble":
            raise InputError("it does not converge")
        hit = found.get(example.portions[0])
        other: tuple[str, Collection[str], Collection[str]] = ("another-rule", {"heat"}, set())
        return [other] if hit is None else [other, ("one", *hit)]

    return run


def _rule(fires: str, silent: str = "1 g of b", off: str = "") -> Rule:
    text = f"rule one\n  fires   {fires}\n  silent  {silent}\n" + (f"  off     {off}\n" if off else "")
    (rule,) = read_rules(text, "f.rule")
    return rule


HIT: dict[str, tuple[Collection[str], Collection[str]]] = {"1 g of a": ({"toxic-gas"}, {"H2S"})}


@pytest.mark.parametrize(
    ("rule", "messages"),
    [
        (_rule("1 g of a"), []),
        (_rule("1 g of a -> H2S"), []),
        (_rule("1 g of a -> toxic-gas"), []),
        (_rule("1 g of a -> Cl2"), ["'1 g of a -> Cl2' fires without 'Cl2'; found were H2S, toxic-gas"]),
        (_rule("1 g of c"), ["'1 g of c' must fire but the rule is silent"]),
        (_rule("1 g of a", "1 g of a"), ["'1 g of a' must be silent but the rule fires (toxic-gas)"]),
        (_rule("1 g of c, known miss: too hard"), []),
        (_rule("1 g of a", "1 g of a, known miss: too eager"), []),
        (
            _rule("1 g of a, known miss: too hard"),
            ["'1 g of a, known miss: too hard' is marked as a known miss but passes now; take the mark away"],
        ),
        (_rule("1 g of trouble"), ["'1 g of trouble' could not be run: it does not converge"]),
        (
            _rule("1 g of trouble, known miss: too hard"),
            ["'1 g of trouble, known miss: too hard' could not be run: it does not converge"],
        ),
        (_rule("1 g of c", off="under review"), []),
    ],
)
def test_examples_are_held_against_the_engine(rule: Rule, messages: list[str]) -> None:
    problems = run_examples([rule], _runner(HIT))
    assert [problem.message for problem in problems] == messages
    assert all(problem.rule == "one" and problem.place is not None for problem in problems)
