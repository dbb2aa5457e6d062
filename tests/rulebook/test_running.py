"""The runner of examples on the shipped graph: a rule that fires is found, one that does not is not."""

from __future__ import annotations

import msgspec
import pytest

from carboy.model.rule import Example, Rule
from carboy.rulebook.running import ExampleRunner, check_examples
from carboy.vetting import Laboratory, laboratory

RULE = "acid-frees-hydrogen-sulfide"
FIRES = Example("", ("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid"), expect="H2S")
SILENT = Example("", ("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M sodium hydroxide"))


@pytest.fixture(scope="module")
def lab() -> Laboratory:
    return laboratory()


@pytest.fixture(scope="module")
def rule(lab) -> Rule:
    return next(one for one in lab.rules if one.id == RULE)


def test_what_was_found(lab):
    runner = ExampleRunner(lab)
    assert any(rule == RULE and "toxic-gas" in kinds and "H2S" in species for rule, kinds, species in runner(FIRES))
    assert not [entry for entry in runner(SILENT) if entry[0] == RULE]


def test_the_setting_of_an_example_is_carried_out(lab):
    example = Example(
        "",
        FIRES.portions,
        {"cover": "sealed", "container": "HDPE", "volume": "4 L", "wait": "24 h", "temperature": "30 degC"},
    )
    case = ExampleRunner(lab).case(example)
    (vessel,) = case.vessels
    assert (vessel.cover, vessel.material, vessel.volume.low) == ("sealed", "hdpe", 4.0)
    assert case.setting.temperature.low == 30.0
    assert case.steps[-1].kind == "wait"
    assert case.steps[-1].duration.low == 24 * 3600


def test_examples_that_hold_and_that_do_not(lab, rule):
    good = msgspec.structs.replace(rule, fires=(FIRES,), silent=(SILENT,))
    assert check_examples(lab, [good]) == []
    wrong = msgspec.structs.replace(rule, fires=(SILENT,), silent=(FIRES,))
    messages = [problem.message for problem in check_examples(lab, [wrong])]
    assert len(messages) == 2
    assert "must fire but the rule is silent" in messages[0]
    assert "must be silent but the rule fires" in messages[1]


def test_a_known_miss_that_passes_is_a_problem(lab, rule):
    miss = msgspec.structs.replace(FIRES, known_miss="not yet")
    (problem,) = check_examples(lab, [msgspec.structs.replace(rule, fires=(miss,), silent=())])
    assert "known miss but passes now" in problem.message


def test_several_processes_find_the_same(lab, rule):
    """With a name that nobody knows among them: it is one line of the list, not the end of it."""
    odd = Example("", ("1 L of water", "5 g of"))
    many = msgspec.structs.replace(rule, fires=(FIRES, odd) * 16, silent=(SILENT,) * 30)
    seen: list[tuple[int, int]] = []
    problems = check_examples(lab, [many], lambda number, total: seen.append((number, total)), workers=2)
    assert len(problems) == 16
    assert all("could not be run" in problem.message for problem in problems)
    assert seen[-1] == (62, 62)


def test_switched_off_rules_are_passed_over(lab, rule):
    off = msgspec.structs.replace(rule, fires=(SILENT,), silent=(FIRES,), off="being rewritten")
    assert check_examples(lab, [off]) == []
