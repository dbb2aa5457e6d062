"""The report on what the graph and the rules leave uncovered."""

from __future__ import annotations

import msgspec

from carboy.knowledge.index import load_index
from carboy.rulebook.book import load_rules
from carboy.rulebook.coverage import coverage, rules_fired
from carboy.text.cases import combine_case
from carboy.vetting import Laboratory

INDEX, BOOK = load_index(), load_rules()
SULFIDE_RULE = "acid-frees-hydrogen-sulfide"


def test_a_class_is_covered_by_a_rule_on_it_or_on_a_class_above_it() -> None:
    bare = msgspec.structs.replace(INDEX, containers={})
    asks_for_haloform = tuple(rule for rule in BOOK if rule.id == "strong-base-on-haloform")
    asks_for_solvent = tuple(rule for rule in BOOK if rule.id == "active-metal-in-halogenated-solvent")
    assert asks_for_haloform
    assert asks_for_solvent
    assert "haloform" in coverage(bare, ()).classes_without_rule
    assert "haloform" not in coverage(bare, asks_for_haloform).classes_without_rule
    assert "halogenated-solvent" in coverage(bare, asks_for_haloform).classes_without_rule
    assert "haloform" not in coverage(bare, asks_for_solvent).classes_without_rule


def test_substances_that_act_through_their_ions_are_no_gap() -> None:
    gaps = coverage(INDEX, BOOK).substances_without_class
    assert "sodium-nitrate" not in gaps  # nitrate has a class
    for key in gaps:
        item = INDEX.substances[key]
        assert not item.classes
        assert not any(INDEX.species[token].classes for token in item.yields if token in INDEX.species)


def test_gases_without_a_henry_constant_have_no_equilibrium() -> None:
    gaps = coverage(INDEX, BOOK).gases_without_henry_constant
    assert "H2S(g)" not in gaps
    assert not {item.product for item in INDEX.equilibria} & set(gaps)


def test_rules_that_a_case_fires_are_taken_off() -> None:
    lab = Laboratory(INDEX, BOOK)
    case = combine_case(("100 mL of 1 M sodium sulfide", "100 mL of 6 M hydrochloric acid"), lab.names, None, None)
    fired = rules_fired(lab, [case], examples=False)
    assert SULFIDE_RULE in fired
    left = coverage(INDEX, BOOK, fired).rules_not_fired
    assert left is not None
    assert SULFIDE_RULE not in left
    assert len(left) == len([rule for rule in BOOK if not rule.off]) - len(fired & {rule.id for rule in BOOK})
    assert coverage(INDEX, BOOK).rules_not_fired is None
