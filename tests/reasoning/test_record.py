"""The record of what led to what, and the paths read from it."""

from __future__ import annotations

import pytest

from carboy.model.report import PathStep
from carboy.reasoning.record import Record
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory
from tests.bench.reports import combined, labels, only, select
from tests.reasoning.small_book import rules, walk

VESSEL = "tank"


def words(path: list[PathStep]) -> list[str]:
    return [step.from_[0] if step.rule == "label" else step.rule for step in path]


def every_label(paths: list[list[PathStep]]) -> set[str]:
    return {word for path in paths for step in path if step.rule == "label" for word in step.from_}


def test_path_of_two_labels_through_one_rule() -> None:
    record = Record()
    record.poured(VESSEL, "salt", "AB -> A + B", {"A": 1.0, "B": 1.0}, 1)
    record.poured(VESSEL, "acid", "HC -> H + C", {"H": 1.0, "C": 1.0}, 2)
    node = record.fired(VESSEL, "make", "A + H -> D", {"A": 1.0, "H": 1.0}, {"D": 1.0}, 2)
    (path,) = record.paths(node)
    assert sorted(words(path)[:2]) == ["acid", "salt"]
    assert words(path)[-1] == "make"
    assert path[-1].to == ["D"]


def test_two_labels_that_supply_the_same_thing_are_both_told_weightiest_first() -> None:
    record = Record()
    record.poured(VESSEL, "little", "", {"A": 0.1}, 1)
    record.poured(VESSEL, "much", "", {"A": 5.0}, 2)
    node = record.fired(VESSEL, "make", "A -> D", {"A": 5.0}, {"D": 5.0}, 2)
    assert [words(path) for path in record.paths(node)] == [["much", "make"], ["little", "make"]]


def test_three_links_back_to_the_labels() -> None:
    record = Record()
    record.poured(VESSEL, "start", "", {"A": 1.0}, 1)
    record.poured(VESSEL, "oxidant", "", {"O": 3.0}, 2)
    record.fired(VESSEL, "one", "A + O -> B", {"A": 1.0, "O": 1.0}, {"B": 1.0}, 2)
    record.fired(VESSEL, "two", "B + O -> C", {"B": 1.0, "O": 1.0}, {"C": 1.0}, 2)
    node = record.fired(VESSEL, "three", "C + O -> D", {"C": 1.0, "O": 1.0}, {"D": 1.0}, 2)
    (path,) = record.paths(node)
    assert set(words(path)) == {"start", "oxidant", "one", "two", "three"}
    order = {name: place for place, name in enumerate(words(path))}
    assert order["start"] < order["one"] < order["two"] < order["three"]
    assert order["oxidant"] < order["one"]


def deep() -> Record:
    """Two labels bring A, A becomes B, B becomes C."""
    record = Record()
    record.poured(VESSEL, "little", "", {"A": 0.1}, 1)
    record.poured(VESSEL, "much", "", {"A": 5.0}, 1)
    record.fired(VESSEL, "one", "A -> B", {"A": 5.0}, {"B": 5.0}, 2)
    return record


def test_both_labels_are_found_one_link_away() -> None:
    record = deep()
    (node,) = record.events_of("one", 2)
    assert every_label(record.paths(node)) == {"little", "much"}


def test_both_labels_are_found_two_links_away() -> None:
    record = deep()
    node = record.fired(VESSEL, "two", "B -> C", {"B": 5.0}, {"C": 5.0}, 2)
    assert every_label(record.paths(node)) == {"little", "much"}


def test_what_one_rule_makes_and_a_label_brings_are_two_ways() -> None:
    record = Record()
    record.poured(VESSEL, "chromate", "", {"Cr": 1.0}, 1)
    record.poured(VESSEL, "chloride", "", {"Cl": 0.2}, 1)
    record.fired(VESSEL, "make-chloride", "Cr -> Cl", {"Cr": 1.0}, {"Cl": 1.0}, 2)
    node = record.fired(VESSEL, "use", "Cl -> X", {"Cl": 1.2}, {"X": 1.2}, 2)
    assert every_label(record.paths(node)) == {"chromate", "chloride"}


def test_what_is_moved_keeps_its_origin() -> None:
    record = Record()
    record.poured("one", "salt", "", {"A": 1.0}, 1)
    record.moved("one", "two", ("A",))
    node = record.fired("two", "make", "A -> B", {"A": 1.0}, {"B": 1.0}, 3)
    assert [words(path) for path in record.paths(node)] == [["salt", "make"]]


def test_a_circle_ends() -> None:
    record = Record()
    record.poured(VESSEL, "salt", "", {"A": 1.0}, 1)
    record.fired(VESSEL, "there", "A -> B", {"A": 1.0}, {"B": 1.0}, 2)
    record.fired(VESSEL, "back", "B -> A", {"B": 1.0}, {"A": 1.0}, 2)
    node = record.fired(VESSEL, "there", "A -> B", {"A": 1.0}, {"B": 1.0}, 2)
    paths = record.paths(node)
    assert paths
    assert every_label(paths) == {"salt"}


# --- through the engine ----------------------------------------------------------------------------------------


def test_chain_through_the_engine_reaches_both_labels() -> None:
    book = rules(
        "first\n  needs   HS- present\n          ClO- present\n  does    HS- + ClO- -> sulfur + Cl- + OH-",
        "second\n  needs   sulfur present\n          ClO- present\n  does    sulfur + 2 ClO- + H2O -> SO3-2 + 2 Cl- + 2 H+",
        "third\n  needs   SO3-2 present\n          ClO- present\n  does    SO3-2 + ClO- -> SO4-2 + Cl-",
    )
    done = walk(book, "100 mL of 0.1 M sodium sulfide", "1 L of 0.05 M sodium hypochlorite")
    nodes = done.record.events_of("third", 2)
    assert nodes
    path = done.record.paths(nodes[0])[0]
    assert [name for name in words(path) if name in ("first", "second", "third")] == ["first", "second", "third"]
    assert any("sulfide" in label for label in every_label([path]))
    assert any("hypochlorite" in label for label in every_label([path]))


def test_every_bottle_that_brings_the_acid_is_in_some_path() -> None:
    report = combined(
        "1 L of 0.1 M sodium sulfide", "100 mL of 1 M sodium bisulfate", "100 mL of 2 M hydrochloric acid"
    )
    gas = only(report, "toxic-gas", "H2S", step=3)
    told = every_label([gas.path, *gas.other_paths])
    assert any("hydrochloric acid" in word for word in told)
    assert any("bisulfate" in word for word in told)
    assert any("sulfide" in word for word in told)


def test_every_bottle_that_brings_the_sulfide_is_in_some_path() -> None:
    report = combined(
        "1 L of 0.1 M sodium sulfide", "50 mL of 0.5 M potassium sulfide", "500 mL of 1 M hydrochloric acid"
    )
    gas = only(report, "toxic-gas", "H2S", step=3)
    told = every_label([gas.path, *gas.other_paths])
    assert any("sodium sulfide" in word for word in told)
    assert any("potassium sulfide" in word for word in told)


def test_three_bottles_path_holds_all_three() -> None:
    # 2 HNO2 + 2 I- + 2 H+ -> I2 + 2 NO: nitrite, iodide, acid
    report = combined(
        "100 mL of 1 M sodium nitrite", "100 mL of 1 M potassium iodide", "100 mL of 2 M hydrochloric acid"
    )
    oxide = [one for one in select(report, "toxic-gas", step=3) if one.rules]
    assert oxide
    told = {word for one in oxide for word in every_label([one.path, *one.other_paths])}
    assert any("nitrite" in word for word in told)
    assert any("hydrochloric acid" in word for word in told)


def test_path_through_a_filter_and_a_second_vessel() -> None:

    lab = laboratory()
    plan = {
        "title": "Sulfide filtrate",
        "vessels": {"tank": {"volume": "5 L"}, "jug": {"volume": "5 L"}},
        "steps": [
            {"add": "1 L of 0.02 M copper sulfate", "to": "tank"},
            {"add": "1 L of 0.1 M sodium sulfide", "to": "tank"},
            {"filter": "tank", "cake": "cake", "filtrate": "jug"},
            {"add": "500 mL of 1 M hydrochloric acid", "to": "jug"},
        ],
    }
    report = lab.vet(case_from_mapping(plan, lab.names))
    gas = only(report, "toxic-gas", "H2S", step=4)
    assert any("sodium sulfide" in word for word in labels(gas))
    assert any("hydrochloric acid" in word for word in labels(gas))
    # 0.1 mol of sulfide less 0.02 for the copper; some H2S stays with the cake's liquid
    assert gas.amount_mol == pytest.approx((0.08, 0.08), rel=0.03)
