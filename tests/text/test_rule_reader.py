"""Rule files: layout, examples, places, the reference in rules/README.md, and printing back."""

from __future__ import annotations

import math
import re
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from carboy.datafiles import data_dir
from carboy.errors import RuleError
from carboy.model.rule import (
    Bound,
    Condition,
    Earlier,
    Example,
    Flag,
    Measured,
    Meeting,
    Place,
    Present,
    Reaction,
    ReactionTerm,
    Rule,
    Vessel,
)
from carboy.rulebook.book import read_rule_sources
from carboy.text.rule_grammar import COVERS, GRADES, KINDS, MOMENTS, PARTS, WHERES, parse_condition
from carboy.text.rule_printer import equation_text, rule_text, without_places
from carboy.text.rule_reader import CLAUSES, SPEEDS, read_rule_files, read_rules

BROKEN = Path(__file__).parent.parent / "broken" / "rules" / "read"

LAYOUT = """\
# a comment of the file
rule one-of-two
  title   First   # a comment behind a clause
  needs   ?s is sulfide,
            dissolved
          pH below 9
    # a comment between items

          no H2O2
  does    2 A +
            B -> C
          C -> D
  says    One text
    over three
             lines.
  guard   First measure
            goes on.
          Second measure.
  cites   source-a, source-b
          source-c
  fires   1 g of CAS 1313-82-2 + 1 L of (2 M a + 3 M b in water), pH 2 | sealed, glass 1 L, wait 24 h, 60 degC
            -> H2, known miss: of no reason, really
  fires   10 mL of SMILES CC#N + 2 g of x -> toxic-gas
  silent  10 mL of x | HDPE
          20 mL of x | 500 mL, open
  moment  storage
  off     under
          review

rule two-of-two
  title   Second
"""


def test_layout_of_clauses_items_and_comments() -> None:
    first, second = read_rules(LAYOUT, "two.rule")
    assert second == Rule(
        "two-of-two", "Second", (), (), "at once", (), "", (), (), (), (), place=Place("two.rule", 30, 1)
    )
    assert first.title == "First"
    assert first.needs == (
        Bound("?s", ("sulfide",), where="dissolved", place=Place("two.rule", 4, 11)),
        Measured("pH", "below", -math.inf, 9.0, place=Place("two.rule", 6, 11)),
        Present("H2O2", negated=True, place=Place("two.rule", 9, 11)),
    )
    assert [one.text for one in first.does] == ["2 A + B -> C", "C -> D"]
    assert first.does[1].place == Place("two.rule", 12, 11)
    assert first.says == "One text over three lines."
    assert first.guard == ("First measure goes on.", "Second measure.")
    assert first.cites == ("source-a", "source-b", "source-c")
    assert (first.moment, first.off, first.speed) == ("storage", "under review", "at once")


def test_examples_are_taken_apart() -> None:
    first, _ = read_rules(LAYOUT, "two.rule")
    whole, smiles = first.fires
    assert whole.portions == ("1 g of CAS 1313-82-2", "1 L of (2 M a + 3 M b in water), pH 2")
    assert whole.setting == {
        "cover": "sealed",
        "container": "glass",
        "volume": "1 L",
        "wait": "24 h",
        "temperature": "60 degC",
    }
    assert (whole.expect, whole.known_miss) == ("H2", "of no reason, really")
    assert (smiles.portions, smiles.expect) == (("10 mL of SMILES CC#N", "2 g of x"), "toxic-gas")
    assert [one.setting for one in first.silent] == [{"container": "HDPE"}, {"volume": "500 mL", "cover": "open"}]


def _readme_blocks() -> list[str]:
    """The indented blocks of the reference."""
    text = (data_dir("rules") / "README.md").read_text(encoding="utf-8")
    return re.findall(r"(?:^ {4,}\S.*\n|^\n(?= {4}))+", text, re.MULTILINE)


def test_every_rule_of_the_reference_reads() -> None:
    whole = [block for block in _readme_blocks() if block.lstrip().startswith("rule ")]
    assert len(whole) == 1
    (rule,) = read_rules(whole[0], "README.md")
    assert [one.expect for one in rule.fires] == ["H2", "H2"]
    assert len(rule.silent) == 2


def test_every_clause_of_the_reference_reads() -> None:
    read = 0
    for block in _readme_blocks():
        word = block.split()[0]
        if word in CLAUSES and "KIND" not in block:
            indent = re.match(r" *", block)
            assert indent is not None
            lines = "".join("  " + line[len(indent[0]) :] + "\n" for line in block.rstrip().split("\n"))
            (rule,) = read_rules(f"rule one\n{lines}")
            read += len(rule.does) + len(rule.flags) + len(rule.fires) + len(rule.silent)
    assert read >= 11


def test_every_condition_of_the_reference_reads() -> None:
    text = (data_dir("rules") / "README.md").read_text(encoding="utf-8")
    section = text[text.index("## needs") : text.index("## does")]
    lines = [line.strip() for line in section.split("\n") if line.startswith("    ")]
    kinds = {type(parse_condition(re.split(r"\s{2,}", line)[0])) for line in lines}
    assert kinds == {Bound, Present, Measured, Vessel, Earlier, Meeting}
    assert len(lines) >= 28


def test_the_reference_names_every_word_of_the_language() -> None:
    text = (data_dir("rules") / "README.md").read_text(encoding="utf-8")
    for word in (*CLAUSES, *KINDS, *SPEEDS, *COVERS, *MOMENTS, *GRADES, *WHERES, *PARTS):
        assert re.search(rf"\b{re.escape(word)}\b", text), word


def test_the_shipped_rules_read_and_print_back() -> None:
    rules = read_rule_files(read_rule_sources().items())
    assert rules
    again = read_rules("".join(map(rule_text, rules)))
    assert tuple(map(without_places, again)) == tuple(map(without_places, rules))


@pytest.mark.parametrize("path", sorted(BROKEN.glob("*.rule")), ids=lambda path: path.stem)
def test_a_broken_file_gives_the_message_beside_it(path: Path) -> None:
    with pytest.raises(RuleError) as caught:
        read_rule_files([(path.name, path.read_bytes())])
    assert str(caught.value) + "\n" == path.with_suffix(".txt").read_text(encoding="utf-8")


def test_there_are_broken_files() -> None:
    assert len(list(BROKEN.glob("*.rule"))) == len(list(BROKEN.glob("*.txt"))) >= 25


def test_an_id_is_unique_over_all_files() -> None:
    with pytest.raises(RuleError, match=r"b\.rule:2:1: there are two rules 'x'; the other is at a\.rule:1:1"):
        read_rule_files([("a.rule", b"rule x\n"), ("b.rule", b"\nrule x\n")])


def test_windows_line_ends_and_a_byte_order_mark_do_not_matter() -> None:
    plain = read_rules(LAYOUT, "f")
    odd = read_rule_files([("f", b"\xef\xbb\xbf" + LAYOUT.replace("\n", "\r\n").encode())])
    assert odd == plain


@given(st.text(alphabet=st.sampled_from("rule needs?ab.,->|+()#\"'1 \n\t%\u00e9"), max_size=200))
def test_no_text_gives_anything_but_rules_or_a_rule_error(text: str) -> None:
    try:
        rules = read_rules("rule a\n  " + text)
    except RuleError:
        return
    assert all(isinstance(rule, Rule) for rule in rules)


# Records as the language can say them, for the round trip.
_IDS = st.from_regex(r"[a-z][a-z0-9]{0,5}(-[a-z0-9]{1,4}){0,2}", fullmatch=True)
_VARIABLES = st.from_regex(r"\?[a-z][a-z0-9_]{0,3}", fullmatch=True)
_NAMES = st.sampled_from(
    ["HS-", "SO4-2", "Hg+2", "H2S(g)", "Fe(CN)6-3", "metal-sulfide", "acetic-acid", "2-propanol", "NO", "PH3", "H+"]
)
_TERMS = st.one_of(_VARIABLES, _NAMES)
_WHERE = st.sampled_from(["any", *WHERES])
_FIGURES = st.floats(min_value=-1e6, max_value=1e6, allow_nan=False).map(lambda value: value + 0.0)
_WORDS = st.lists(st.from_regex(r"[A-Za-z0-9.,;()%'-]{1,9}", fullmatch=True), min_size=1, max_size=30).map(" ".join)


def _some(item: st.SearchStrategy[str], least: int = 1) -> st.SearchStrategy[tuple[str, ...]]:
    return st.lists(item, min_size=least, max_size=3).map(tuple)


@st.composite
def _windows(draw: st.DrawFn) -> tuple[str, float, float]:
    compare = draw(st.sampled_from(["above", "below", "at least", "at most", "between"]))
    low, high = sorted((draw(_FIGURES), draw(_FIGURES)))
    if compare == "between":
        return compare, low, high
    return (compare, low, math.inf) if compare in ("above", "at least") else (compare, -math.inf, high)


_WITH_A_TERM = ("strength", "mass fraction", "amount", "mass", "ratio", "property")
_QUANTITIES = ("pH", "temperature", "water fraction", "ionic strength", "headspace", *_WITH_A_TERM)


@st.composite
def _measured(draw: st.DrawFn) -> Measured:
    quantity = draw(st.sampled_from(_QUANTITIES))
    term = draw(_TERMS) if quantity in _WITH_A_TERM else ""
    other = ""
    if quantity == "ratio":
        other = draw(_TERMS)
    elif quantity == "property":
        other = draw(st.sampled_from(["charge", "oxidation state", "carbons"]))
    compare, low, high = draw(_windows())
    return Measured(quantity, compare, low, high, term, other)  # type: ignore[arg-type]


_CONDITIONS: st.SearchStrategy[Condition] = st.one_of(
    st.builds(Bound, _VARIABLES, _some(_NAMES), _some(_NAMES, 0), _WHERE, st.none()),
    st.builds(Present, _NAMES, st.booleans(), _WHERE, st.none()),
    _measured(),
    st.builds(Vessel, st.just("cover"), _some(st.sampled_from(COVERS)), st.booleans(), st.none()),
    st.builds(
        Vessel, st.just("container"), _some(st.sampled_from(["HDPE", "glass", "brass"])), st.booleans(), st.none()
    ),
    st.builds(Earlier, _VARIABLES, _some(_NAMES), st.none()),
    st.builds(Meeting, _VARIABLES, _VARIABLES, st.none()),
)
_WHEN = st.lists(_CONDITIONS, max_size=2).map(tuple)


@st.composite
def _reactions(draw: st.DrawFn) -> Reaction:
    balance = draw(st.booleans())
    counts = st.one_of(st.integers(1, 12).map(float), st.sampled_from([0.5, 1.5, 1 / 3]))

    def side() -> tuple[ReactionTerm, ...]:
        terms = []
        for _ in range(draw(st.integers(1, 3))):
            term = draw(_TERMS)
            part = draw(st.sampled_from(["", *PARTS])) if term.startswith("?") else ""
            written = draw(st.one_of(st.none(), counts)) if balance else draw(counts)
            terms.append(ReactionTerm(term, part, written))
        return tuple(terms)

    share = draw(st.sampled_from([(1.0, 1.0), (0.5, 1.0), (0.0, 0.25)]))
    bare = Reaction(side(), side(), balance, "", draw(_WHEN), share)
    return Reaction(bare.reactants, bare.products, balance, equation_text(bare), bare.when, share)


@st.composite
def _examples(draw: st.DrawFn) -> Example:
    portions = ("5 g of zinc powder", "200 mL of (2 M a + 1 M b in water), pH 2", "10 mL of SMILES CC#N")
    chosen = tuple(draw(st.lists(st.sampled_from(portions), min_size=1, max_size=3)))
    setting = draw(
        st.fixed_dictionaries(
            {},
            optional={
                "cover": st.sampled_from(COVERS),
                "volume": st.sampled_from(["1 L", "250 mL"]),
                "wait": st.sampled_from(["24 h", "3 d"]),
                "temperature": st.sampled_from(["60 degC", "300 K"]),
            },
        )
    )
    text = " + ".join(chosen)
    if setting:
        text += " | " + ", ".join(("wait " if key == "wait" else "") + value for key, value in setting.items())
    expect = draw(st.sampled_from(["", "H2S", "toxic-gas"]))
    text += f" -> {expect}" if expect else ""
    miss = draw(st.one_of(st.just(""), _WORDS))
    text += f", known miss: {miss}" if miss else ""
    return Example(text, chosen, setting, expect, miss)


_FLAGS = st.builds(
    Flag,
    st.sampled_from(KINDS),
    _some(_TERMS, 0),
    st.one_of(st.just(""), _WORDS),
    st.one_of(st.just(""), _TERMS),
    st.sampled_from(["", *GRADES]),
    st.sampled_from(["", *MOMENTS]),
    _WHEN,
    st.none(),
)
_RULES = st.builds(
    Rule,
    id=_IDS,
    title=_WORDS,
    needs=st.lists(_CONDITIONS, max_size=4).map(tuple),
    does=st.lists(_reactions(), max_size=2).map(tuple),
    speed=st.sampled_from(SPEEDS),
    flags=st.lists(_FLAGS, max_size=2).map(tuple),
    says=st.one_of(st.just(""), _WORDS),
    guard=_some(_WORDS, 0),
    cites=_some(_IDS, 0),
    fires=st.lists(_examples(), max_size=2).map(tuple),
    silent=st.lists(_examples(), max_size=2).map(tuple),
    moment=st.sampled_from(["", *MOMENTS]),
    off=st.one_of(st.just(""), _WORDS),
    place=st.none(),
)


@settings(max_examples=150, deadline=None)
@given(_RULES)
def test_a_rule_that_is_printed_reads_back_as_it_was(rule: Rule) -> None:
    (read,) = read_rules(rule_text(rule))
    assert without_places(read) == rule
    assert rule_text(read) == rule_text(rule)
