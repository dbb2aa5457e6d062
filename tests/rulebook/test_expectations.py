"""Expectations of a case against reports made by hand: each field fails by itself."""

from __future__ import annotations

import pytest

from carboy.model.plan import Add, Case, Expectation
from carboy.rulebook.expectations import check_expectations, expectation_text
from tests.reports.made_report import finding, goal, report

MADE = report(
    findings=[
        finding(),
        finding(kind="heat", signal="warning", species=[], summary="It warms by 30 K."),
        finding(order="other order", kind="foam"),
    ],
    goals=[goal(True)],
    questions=["Titrate the unknown."],
)
GOAL = MADE.goals[0].goal


def reasons(**fields: object) -> list[str]:
    case = Case(title="t", steps=(Add(to="jug"),), expect=(Expectation.model_validate(fields),))
    return [failure.reason for failure in check_expectations(MADE, case)]


@pytest.mark.parametrize(
    "fields",
    [
        {"step": 2, "kind": "toxic-gas"},
        {
            "step": 2,
            "kind": "toxic-gas",
            "species": "H2S",
            "signal": "danger",
            "moment": "during",
            "rule": "acid-frees-sulfide",
        },
        {"step": 1, "kind": "toxic-gas", "absent": True},
        {"kind": "explosive", "absent": True},
        {"kind": "foam", "absent": True},  # what only the other order brings does not count
        {"kind": "heat", "signal": "danger", "absent": True},
        {"verdict": "refuse"},
        {"step": 2, "quantity": "pH", "low": 0.9, "high": 1.0},
        {"quantity": "pH", "high": 1.0},  # of the last step
        {"step": 2, "quantity": "gas_mol H2S", "low": 0.05, "high": 0.06},
        {"step": 2, "quantity": "dissolved_mol Hg", "high": 1e-9},
        {"step": 1, "quantity": "volume_L", "low": 0.02, "high": 0.02},
        {"kind": "toxic-gas", "quantity": "amount_mol", "low": 0.099, "high": 0.101},
        {"goal": GOAL, "met": True},
        {"words": "titrate"},
        {"kind": "toxic-gas", "words": "above pH 10"},
        {"kind": "toxic-gas", "words": "titrate", "absent": True},
        {"kind": "explosive", "known_failure": "nobody knows"},
    ],
)
def test_holds(fields):
    assert reasons(**fields) == []


@pytest.mark.parametrize(
    ("fields", "reason"),
    [
        (
            {"step": 1, "kind": "toxic-gas"},
            "there is no such finding; of that kind there is step 2 danger toxic-gas H2S during",
        ),
        ({"kind": "toxic-gas", "species": "HCN"}, "no such finding"),
        ({"kind": "toxic-gas", "signal": "note"}, "no such finding"),
        ({"kind": "toxic-gas", "moment": "storage"}, "no such finding"),
        ({"kind": "toxic-gas", "rule": "another"}, "no such finding"),
        ({"kind": "foam"}, "no such finding"),
        ({"kind": "toxic-gas", "absent": True}, "there is 'Hydrogen sulfide is set free: 0.1 mol.'"),
        ({"verdict": "no objection"}, "the verdict is refuse"),
        ({"step": 2, "quantity": "pH", "low": 7.0}, "pH is 0.951"),
        ({"step": 1, "quantity": "pH", "low": 7.0}, "step 1 has no pH"),
        ({"step": 2, "quantity": "gas_mol H2S", "high": 0.055}, "gas_mol H2S is 0.05 to 0.06"),
        ({"step": 2, "quantity": "dissolved_mol Hg", "low": 1e-9}, "dissolved_mol Hg is 0"),
        ({"kind": "toxic-gas", "quantity": "amount_mol", "low": 0.2}, "amount_mol is 0.1"),
        ({"kind": "heat", "quantity": "amount_mol", "high": 0.05}, "amount_mol is 0.1"),
        ({"goal": GOAL, "met": False}, "the goal is met (0.01 to 0.5 mg/L)"),
        ({"words": "chlorine"}, "the words are nowhere in it"),
        ({"kind": "heat", "words": "titrate"}, "the words are nowhere in it"),
        ({"words": "Titrate", "absent": True}, "the words are there"),
        ({"kind": "toxic-gas", "known_failure": "old"}, "marked as a known failure (old) but holds now"),
    ],
)
def test_fails(fields, reason):
    (found,) = reasons(**fields)
    assert reason in found


def test_failures_keep_the_order_of_the_file():
    case = Case(
        title="t",
        steps=(Add(to="jug"),),
        expect=(Expectation(verdict="no objection"), Expectation(kind="toxic-gas"), Expectation(kind="fire")),
    )
    assert [failure.expectation.verdict + failure.expectation.kind for failure in check_expectations(MADE, case)] == [
        "no objection",
        "fire",
    ]


def test_an_expectation_in_words():
    one = Expectation(step=4, kind="toxic-gas", species="HCN", absent=True)
    assert expectation_text(one) == "step 4, toxic-gas, HCN absent"
    assert expectation_text(Expectation(step=2, quantity="pH", low=7, high=9)) == "step 2, pH between 7 and 9"
