"""Labels: the exact records, and errors at their place."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from carboy.errors import InputError
from carboy.knowledge.index import load_index
from carboy.knowledge.names import Names
from carboy.model.plan import Ingredient, Interval, Portion, Strength
from carboy.span import Span
from carboy.text.portions import parse_portion
from tests.text.stand_in_names import StandInNames

NAMES = StandInNames()
BROKEN = Path(__file__).parents[1] / "broken" / "portions.txt"
INF = float("inf")


def strength(unit: str, low: float | None = None, high: float | None = None) -> Strength:
    value = None if low is None else Interval(low=low, high=low if high is None else high)
    return Strength(unit=unit, value=value)  # type: ignore[arg-type]


def read(text: str) -> Portion:
    return parse_portion(text, NAMES)


def summary(portion: Portion) -> list[tuple[str, str, Strength]]:
    return [(item.words, item.reference, item.strength) for item in portion.ingredients]


NEAT = strength("neat")
UNKNOWN = strength("unknown")

ONE_INGREDIENT = [
    ("500 mL of 6 % sodium hypochlorite", 0.5, "L", "substance:sodium-hypochlorite", strength("w/w", 0.06), ""),
    ("250 mL of 2 M NaOH", 0.25, "L", "substance:sodium-hydroxide", strength("mol/L", 2.0), ""),
    ("250 mL 2M NaOH", 0.25, "L", "substance:sodium-hydroxide", strength("mol/L", 2.0), ""),
    ("50 mL of acetone", 0.05, "L", "substance:acetone", NEAT, ""),
    ("50 mL of acetone.", 0.05, "L", "substance:acetone", NEAT, ""),
    ("1 L of water", 1.0, "L", "substance:water", NEAT, ""),
    ("5 g of zinc powder", 5.0, "g", "substance:zinc", NEAT, "powder"),
    ("5 g of powdered zinc", 5.0, "g", "substance:zinc", NEAT, "powder"),
    ("5 g of zinc metal powder", 5.0, "g", "substance:zinc", NEAT, "powder"),
    ("5 g of NaOH pellets", 5.0, "g", "substance:sodium-hydroxide", NEAT, "pellets"),
    ("5 g of pellets of NaOH", 5.0, "g", "substance:sodium-hydroxide", NEAT, "pellets"),
    ("5 g of zinc dust", 5.0, "g", "material:fine-zinc", NEAT, ""),  # part of a known name
    ("20 g of CAS 1313-82-2", 20.0, "g", "substance:sodium-sulfide", NEAT, ""),
    ("20 g of CAS no. 1313-82-2", 20.0, "g", "substance:sodium-sulfide", NEAT, ""),
    ("20 g of 1313-82-2", 20.0, "g", "substance:sodium-sulfide", NEAT, ""),
    ("10 mL of SMILES CC(=O)C", 0.01, "L", "smiles:CC(=O)C", NEAT, ""),
    ("10 mL of 0.1 M SMILES CC(=O)O", 0.01, "L", "smiles:CC(=O)O", strength("mol/L", 0.1), ""),
    ("200 mL of concentrated nitric acid", 0.2, "L", "substance:nitric-acid", strength("concentrated"), ""),
    ("200 mL conc. nitric acid", 0.2, "L", "substance:nitric-acid", strength("concentrated"), ""),
    ("200 mL of nitric acid, concentrated", 0.2, "L", "substance:nitric-acid", strength("concentrated"), ""),
    ("200 mL of dilute nitric acid", 0.2, "L", "substance:nitric-acid", strength("dilute"), ""),
    (
        "1 L of saturated sodium chloride solution",
        1.0,
        "L",
        "substance:sodium-chloride",
        strength("saturated"),
        "solution",
    ),
    ("1 L of sodium chloride solution", 1.0, "L", "substance:sodium-chloride", UNKNOWN, "solution"),
    ("1 L of sodium chloride of unknown strength", 1.0, "L", "substance:sodium-chloride", UNKNOWN, ""),
    ("1 L of a 10 % solution of NaOH", 1.0, "L", "substance:sodium-hydroxide", strength("w/w", 0.1), "solution"),
    ("1 L of 10 % aqueous NaOH", 1.0, "L", "substance:sodium-hydroxide", strength("w/w", 0.1), "solution"),
    ("1 L of hydrogen peroxide 30 %", 1.0, "L", "substance:hydrogen-peroxide", strength("w/w", 0.3), ""),
    ("1 L of hydrogen peroxide (30 %)", 1.0, "L", "substance:hydrogen-peroxide", strength("w/w", 0.3), ""),
    ("1 L of hydrogen peroxide (H2O2), 30 %", 1.0, "L", "substance:hydrogen-peroxide", strength("w/w", 0.3), ""),
    ("1 L of concentrated (37 %) HCl", 1.0, "L", "substance:hydrochloric-acid", strength("w/w", 0.37), ""),
    ("100 mL of 5 % w/v NaCl", 0.1, "L", "substance:sodium-chloride", strength("w/v", 0.05), ""),
    ("100 mL of 5 % (w/v) NaCl", 0.1, "L", "substance:sodium-chloride", strength("w/v", 0.05), ""),
    ("100 mL of 10 g/100 mL NaCl", 0.1, "L", "substance:sodium-chloride", strength("g/L", 100.0), ""),
    ("100 mL of 1,2-dichloroethane", 0.1, "L", "substance:1,2-dichloroethane", NEAT, ""),
    ("100 mL of N,N-dimethylformamide", 0.1, "L", "substance:n,n-dimethylformamide", NEAT, ""),
    ("100 mL of 2 N N,N-dimethylformamide", 0.1, "L", "substance:n,n-dimethylformamide", strength("eq/L", 2.0), ""),
    ("100 mL of (NH4)2S", 0.1, "L", "substance:ammonium-sulfide", NEAT, ""),
    ("100 mL of sodium dispersion in oil", 0.1, "L", "material:sodium-dispersion", NEAT, ""),
    ("5 g of N+ salt tablets", 5.0, "g", "substance:cobalt-blue-tablets", NEAT, ""),
    ("0.5 mol of NaOH", 0.5, "mol", "substance:sodium-hydroxide", NEAT, ""),
]


@pytest.mark.parametrize("case", ONE_INGREDIENT, ids=lambda case: case[0])
def test_one_ingredient(case: tuple[str, float, str, str, Strength, str]) -> None:
    text, amount, unit, reference, of, form = case
    portion = read(text)
    assert portion.amount == Interval(low=amount, high=amount)
    assert portion.unit == unit
    assert [(item.reference, item.strength) for item in portion.ingredients] == [(reference, of)]
    assert portion.form == form
    assert (portion.solvent, portion.pH) == ("substance:water", None)
    assert portion.text == text


def test_the_whole_record() -> None:
    text = "about 500 mL of (6 % sodium hypochlorite + flurbium), pH 12"
    assert read(text) == Portion(
        text=text,
        amount=Interval(low=0.4, high=0.6),
        unit="L",
        ingredients=(
            Ingredient(
                words="sodium hypochlorite",
                reference="substance:sodium-hypochlorite",
                strength=strength("w/w", 0.06),
                span=Span(text, 21, 40),
            ),
            Ingredient(words="flurbium", reference="unrecognised", strength=UNKNOWN, span=Span(text, 43, 51)),
        ),
        solvent="substance:water",
        solvent_words="water",
        pH=Interval(low=12.0, high=12.0),
        form="",
    )


@pytest.mark.parametrize(
    "text",
    [
        "1 L of (0.05 M mercury(II) nitrate + 0.5 M nitric acid)",
        "1 L of (0.05 M mercury(II) nitrate + 0.5 M nitric acid in water)",
        "1 L of (0.05 M mercury(II) nitrate + 0.5 M nitric acid) in water",
        "1 L of (0.05 M mercury(II) nitrate+0.5 M nitric acid)",
        "1 L of (0.05 M mercury(II) nitrate, 0.5 M nitric acid)",
        "1 L of (0.05 M mercury(II) nitrate and 0.5 M nitric acid)",
        "1 L of (0.05 M mercury(II) nitrate + 0.5 M nitric acid + water)",
        "1 L of 0.05 M mercury(II) nitrate in 0.5 M nitric acid",
    ],
)
def test_one_solution_of_two(text: str) -> None:
    portion = read(text)
    assert summary(portion) == [
        ("mercury(II) nitrate", "substance:mercury(II)-nitrate", strength("mol/L", 0.05)),
        ("nitric acid", "substance:nitric-acid", strength("mol/L", 0.5)),
    ]
    assert portion.solvent == "substance:water"


def test_ranges_of_a_waste_bottle() -> None:
    portion = read("about 4 L of (10-50 g/L copper sulfate + trace of mercury(II) nitrate + acetone in water), pH 1-2")
    assert portion.amount == Interval(low=3.2, high=4.8)
    assert summary(portion) == [
        ("copper sulfate", "substance:copper-sulfate", strength("g/L", 10.0, 50.0)),
        ("mercury(II) nitrate", "substance:mercury(II)-nitrate", strength("trace")),
        ("acetone", "substance:acetone", UNKNOWN),
    ]
    assert portion.pH == Interval(low=1.0, high=2.0)


@pytest.mark.parametrize(
    "text", ["20 g of Na2S·9H2O", "20 g of Na2S.9H2O", "20 g of Na2S*9H2O", "20 g of sodium sulfide nonahydrate"]
)
def test_hydrates(text: str) -> None:
    (item,) = read(text).ingredients
    assert (item.reference, item.hydrate) == ("substance:sodium-sulfide", 9.0)


@pytest.mark.parametrize(
    ("text", "words", "low", "high"),
    [
        ("1 L of unknown, pH 2", "unknown", 2.0, 2.0),
        ("1 L of unknown acid, pH 1-2", "unknown acid", 1.0, 2.0),
        ("1 L of pH 1-2 unknown acid", "unknown acid", 1.0, 2.0),
        ("1 L of an unknown liquid at pH 7", "unknown liquid", 7.0, 7.0),
        ("1 L of unknown, pH below 2", "unknown", -1.0, 2.0),
        ("1 L of unknown (pH 2)", "unknown", 2.0, 2.0),
    ],
)
def test_unknowns(text: str, words: str, low: float, high: float) -> None:
    portion = read(text)
    assert [(item.words, item.reference) for item in portion.ingredients] == [(words, "unknown")]
    assert portion.pH == Interval(low=low, high=high)
    assert portion.unrecognised == portion.ingredients


def test_a_pH_of_a_known_solution() -> None:
    assert read("1 L of (0.1 M NaCl, pH 7-9)").pH == Interval(low=7.0, high=9.0)
    assert read("1 L of 0.1 M NaCl, pH 7 in ethanol").solvent == "substance:ethanol"
    assert read("1 L of 0.1 M NaCl, pH unknown").pH is None


def test_solvents() -> None:
    portion = read("1 L of 0.1 M sodium sulfide in ethanol")
    assert (portion.solvent, portion.solvent_words) == ("substance:ethanol", "ethanol")
    assert summary(portion) == [("sodium sulfide", "substance:sodium-sulfide", strength("mol/L", 0.1))]
    assert read("1 L of sodium sulfide in ethanol").ingredients[0].strength == UNKNOWN


def test_an_unknown_solvent_is_among_the_unrecognised() -> None:
    portion = read("1 L of 0.1 M NaCl in flurbium")
    assert (portion.solvent, portion.solvent_words) == ("unrecognised", "flurbium")
    assert [item.words for item in portion.unrecognised] == ["flurbium"]


def test_an_unknown_name_is_carried_on_with_suggestions() -> None:
    portion = read("100 mL of flurbium nitrate")
    assert summary(portion) == [("flurbium nitrate", "unrecognised", NEAT)]
    assert read("100 mL of sodium chlorid").ingredients[0].suggestions[0] == "sodium chloride"
    assert [item.words for item in portion.unrecognised] == ["flurbium nitrate"]


def test_open_amounts() -> None:
    assert read("up to 2 L of acetone").amount == Interval(low=0.0, high=2.0)
    assert read("at least 2 L of acetone").amount == Interval(low=2.0, high=INF)
    assert read("unknown volume of acetone").amount == Interval(low=0.0, high=INF)
    assert read("unknown mass of zinc").unit == "g"


def test_places_within_a_file() -> None:
    text = "bottles:\n  a: 100 mm of acetone\n"
    with pytest.raises(InputError) as caught:
        parse_portion("100 mm of acetone", NAMES, file="store.yaml", within=text, offset=text.index("100"))
    assert caught.value.span is not None
    assert caught.value.span.place == "store.yaml:2:10"
    assert caught.value.message == "'mm' is a length, which is not an amount"
    assert caught.value.suggestions[0] == "mL"


def broken() -> list[tuple[str, str]]:
    """The blocks of the file: ``> text`` and the error as it is shown."""
    blocks = BROKEN.read_text(encoding="utf-8").split("\n\n")
    return [(block.split("\n", 1)[0].removeprefix("> "), block.split("\n", 1)[1].rstrip("\n")) for block in blocks]


def test_the_file_of_broken_portions_is_read() -> None:
    assert len(broken()) == BROKEN.read_text(encoding="utf-8").count("\n> ") + 1
    assert len(broken()) > 50


@pytest.mark.parametrize(("text", "expected"), broken())
def test_broken_portions(text: str, expected: str) -> None:
    with pytest.raises(InputError) as caught:
        read(text)
    assert str(caught.value) == expected


def test_characters_that_cannot_be_shown() -> None:
    with pytest.raises(InputError, match="this character cannot stand in a portion"):
        read("100 mL of ace\x07tone")
    with pytest.raises(InputError, match="longer than any label"):
        read("100 mL of " + "a" * 5000)
    with pytest.raises(InputError, match="a portion is missing here"):
        read("  ")


def check(text: str) -> None:
    try:
        portion = read(text)
    except InputError as caught:
        message, span = caught.message, caught.span
    else:
        assert portion.ingredients
        assert portion.amount.low <= portion.amount.high
        return
    assert span is not None
    assert 0 <= span.start <= span.end <= len(text)
    assert "\n" not in message


@settings(max_examples=300, deadline=None)
@given(st.text(max_size=60))
def test_any_text_gives_a_portion_or_an_input_error(text: str) -> None:
    check(text)


@settings(max_examples=300, deadline=None)
@given(st.text(max_size=40))
def test_any_name_gives_a_portion_or_an_input_error(text: str) -> None:
    check("10 mL of " + text)


_PIECES = (
    *("10 mL", "5 g", "1-2 L", "about ", " of ", "(", ")", " + ", "+", ", ", "6 %", "2 M", "5 mm", "NaCl", "acetone"),
    *(" in ", "pH 2", "pH", "conc. ", "saturated ", "powder", "solution", "unknown", "trace of ", "SMILES C", "CAS 1"),
    *("and", "blarg", "water", " ", ":", "1:10", ".", "·", "flurb", "of unknown strength", "(30 %)", "in", "%", "(aq)"),
)


@settings(max_examples=500, deadline=None)
@given(st.lists(st.sampled_from(_PIECES), max_size=9))
def test_pieces_of_labels_give_a_portion_or_an_input_error(pieces: list[str]) -> None:
    check("10 mL of " + "".join(pieces))
    check(" ".join(pieces))


@pytest.fixture(scope="module")
def graph_names() -> Names:
    return Names(load_index())


@pytest.mark.parametrize(
    ("text", "references"),
    [
        ("500 mL of 6 % sodium hypochlorite", ["sodium-hypochlorite"]),
        ("20 g of sodium sulfide nonahydrate", ["sodium-sulfide-nonahydrate"]),
        ("20 g of Na2S.9H2O", ["sodium-sulfide-nonahydrate"]),
        ("250 mL of 2 M NaOH", ["sodium-hydroxide"]),
        ("50 mL of acetone", ["acetone"]),
        ("1 L of (0.05 M mercury(II) nitrate + 0.5 M nitric acid)", ["mercury-ii-nitrate", "nitric-acid"]),
        (
            "4 L of (10-50 g/L copper sulfate + 0.5 M sulfuric acid in water)",
            ["copper-ii-sulfate-pentahydrate", "sulfuric-acid"],
        ),
        ("about 2 L of household bleach", ["household-bleach"]),
        ("5 g of zinc powder", ["zinc"]),
        ("20 g of CAS 1313-82-2", ["sodium-sulfide"]),
        ("10 mL of SMILES CC(=O)C", ["CC(=O)C"]),
        ("200 mL of concentrated nitric acid", ["nitric-acid"]),
        ("1 L of unknown, pH 2", ["unknown"]),
        ("100 mL of N,N-dimethylformamide", ["dimethylformamide"]),
        ("1 L of 2.5 M n-BuLi in hexanes", ["n-butyllithium"]),
        ("1 L of 10% formalin", ["neutral-buffered-formalin"]),
        ("100 mL of flurbium nitrate", ["unrecognised"]),
    ],
)
def test_labels_against_the_graph(graph_names: Names, text: str, references: list[str]) -> None:
    portion = parse_portion(text, graph_names)
    assert [item.reference.partition(":")[2] or item.reference for item in portion.ingredients] == references
