"""``carboy look``, ``ask``, ``rule`` and ``kb check`` on what ships."""

from __future__ import annotations

import json

import pytest

from carboy.cli.main import application
from carboy.rulebook.book import load_rules


def test_look_shows_values_with_origin_and_source(carboy):
    ran = carboy("look", "hydrogen", "sulfide")
    assert ran.status == 0
    text = " ".join(ran.out.split())
    assert "hydrogen sulfide, substance" in text
    assert "molar mass 34.08 g/mol (computed" in text
    assert "IDLH 100 ppm (looked up" in text
    assert "Sources [1]" in text
    assert "National Institute for Occupational Safety and Health" in text


@pytest.mark.parametrize(
    ("name", "heading"),
    [
        ("muriatic acid", "muriatic acid, material"),
        ("1313-82-2", "sodium sulfide, substance"),
        ("NaOCl", "sodium hypochlorite, substance"),
        ("metal sulfides", "metal sulfide, class"),
        ("HDPE", "HDPE, container material"),
        ("niosh-idlh", "niosh-idlh, source"),
        ("Hg+2", "mercury(II) ion Hg²⁺, species"),
    ],
)
def test_look_finds_every_kind_of_thing(carboy, name, heading):
    assert heading in carboy("look", name).out.splitlines()


def test_look_suggests_what_is_near(carboy):
    ran = carboy("look", "sodium sulfidee")
    assert ran.status == 2
    assert "Did you mean 'sodium sulfide'" in ran.err


def test_look_as_json(carboy):
    found = json.loads(carboy("look", "HDPE", "--json").out)
    assert found[0]["sort"] == "container material"
    assert any(fact["text"] == "bromine" for fact in found[0]["facts"])


def test_ask_which_rules_set_toxic_gas_free_by_acid(carboy):
    ran = carboy("ask", "?r gives ?g, ?g is toxic-gas, ?r needs acid")
    assert ran.status == 0
    cells = [line.split() for line in ran.out.splitlines()[1:-2] if not line.startswith(" ")]
    pairs = {(line[0], line[1]) for line in cells}
    assert ("acid-frees-hydrogen-sulfide", "H₂S") in pairs
    assert ("acid-frees-hydrogen-cyanide", "HCN") in pairs
    assert not [rule for rule, _ in pairs if rule.startswith("base-frees")]


def test_ask_joins_over_the_graph(carboy):
    found = json.loads(carboy("ask", "?s dissolves into CN-, ?s contains zinc", "--json").out)
    assert {"?s": "zinc-cyanide"} in found
    bleach = carboy("ask", "?m contains sodium hypochlorite").out.splitlines()
    assert "household bleach" in bleach


def test_ask_takes_a_molecule_for_one_thing_as_substance_in_water_and_in_the_air(carboy):
    by_name, by_formula, by_gas = (
        json.loads(carboy("ask", f"?r gives {name}, ?r needs acid", "--json").out)
        for name in ("hydrogen cyanide", "HCN", "HCN(g)")
    )
    assert {"?r": "acid-frees-hydrogen-cyanide"} in by_formula
    assert by_name == by_formula == by_gas


def test_ask_with_exception_leaves_out_what_is_excluded(carboy):
    every = {row["?s"] for row in json.loads(carboy("ask", "?s is oxidiser", "--json").out)}
    but = {row["?s"] for row in json.loads(carboy("ask", "?s is oxidiser but not nitrate", "--json").out)}
    nitrates = {row["?s"] for row in json.loads(carboy("ask", "?s is nitrate", "--json").out)}
    assert nitrates & every
    assert but == every - nitrates


def test_ask_without_an_answer_is_status_1(carboy):
    ran = carboy("ask", "?s dissolves into CN-, ?s contains helium")
    assert ran.status == 1
    assert "Nothing" in ran.out


def test_ask_marks_the_word_it_does_not_know(carboy):
    ran = carboy("ask", "?r needs hypochlorit")
    assert ran.status == 2
    assert "         ^^^^^^^^^^^" in ran.err
    assert "'hypochlorite'" in ran.err


def test_rule_tells_itself_from_the_rule_file(carboy):
    rule = next(one for one in load_rules() if one.id == "acid-frees-hydrogen-sulfide")
    text = " ".join(carboy("rule", rule.id).out.split())
    assert rule.title in text
    assert rule.says in text
    for guard in rule.guard:
        assert guard in text
    for example in (*rule.fires, *rule.silent):
        assert example.text in text
    assert f"{rule.place.file}:{rule.place.line}" in text


def test_rule_lists_all(carboy):
    assert carboy("rule").out.splitlines()[-1] == f"{len(load_rules())} rules"


def test_rule_suggests(carboy):
    assert "'acid-frees-hydrogen-sulfide'" in carboy("rule", "acid-frees-hydrgen-sulfide").err


def test_every_command_teaches_by_example(carboy):
    names = [command.name for command in application().registered_commands]
    assert {"combine", "vet", "look", "ask", "rule", "cases"} <= set(names)
    for name in names:
        ran = carboy(name, "--help")
        assert ran.status == 0
        assert ran.out.count(f"carboy {name}") >= 2, name
    assert "carboy kb check --rule" in carboy("kb", "check", "--help").out


def test_version(carboy):
    assert carboy("--version").out.startswith("carboy 0.")


def test_coverage_lists_what_no_rule_asks_for(carboy):
    found = json.loads(carboy("kb", "coverage", "--quick", "--json").out)
    assert found["rules_not_fired"] is None
    asked = {text for rule in load_rules() if not rule.off for text in str(rule.needs).split("'")}
    assert asked.isdisjoint(found["classes_without_rule"])
    text = carboy("kb", "coverage", "--quick", "--plain").out
    assert f"Classes that no rule asks for: {len(found['classes_without_rule'])}" in text
    assert f"Substances without a CAS number: {len(found['substances_without_cas'])}" in text
    assert "Rules that no" not in text
    assert carboy("kb", "coverage", "--quick", "--examples").status == 2
