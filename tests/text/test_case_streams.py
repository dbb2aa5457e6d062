"""Steps about streams (filter aid, paper, first runnings, washings, samples, wiping) as records, and what is refused of them."""

from __future__ import annotations

from typing import Any

import pytest

from carboy.errors import InputError
from carboy.model.plan import Absorbent, Case, Filter, Interval, Rinse, Transfer, Wait, Wipe
from carboy.text.case_writer import case_text
from carboy.text.cases import case_from_mapping, read_case
from tests.text.stand_in_names import StandInNames

BEGINNING: tuple[dict[str, str], ...] = ({"add": "1 L of 0.1 M mercury(II) nitrate", "to": "tank"},)


def case_with(*steps: dict[str, str]) -> Case:
    data: dict[str, Any] = {
        "title": "streams",
        "vessels": {"tank": {"volume": "10 L", "material": "HDPE"}},
        "steps": [*BEGINNING, *steps],
    }
    return case_from_mapping(data, StandInNames())


def test_a_filter_with_everything():
    step = case_with(
        {
            "filter": "tank",
            "cake": "cake",
            "filtrate": "jug",
            "retained": "1.5 mL/g",
            "passes": "1-3 %",
            "aid": "20 g, 3 mL/g",
            "paper": "5 g of filter paper",
            "waste": "bin",
            "first_runnings": "200 mL",
            "runnings": "beaker",
        }
    ).steps[1]
    assert isinstance(step, Filter)
    assert step.aid is not None
    assert step.paper is not None
    assert (step.aid.grams, step.aid.holds, step.aid.words) == (20.0, 3.0, "filter aid")
    assert (step.paper.grams, step.paper.holds, step.paper.words) == (5.0, None, "filter paper")
    assert (step.waste, step.runnings) == ("bin", "beaker")
    assert step.first_runnings == Interval(low=0.2, high=0.2)
    assert step.passes == Interval(low=0.01, high=0.03)


def test_paper_goes_to_a_bin_of_its_own_if_none_is_named():
    step = case_with({"filter": "tank", "paper": "5 g"}, {"wipe": "filtrate", "with": "2 kg of paper"}).steps
    assert isinstance(step[1], Filter)
    assert isinstance(step[2], Wipe)
    assert step[1].waste == step[2].to == "contaminated solids"
    assert step[2].absorbent.grams == 2000.0


def test_washing_sampling_settling():
    steps = case_with(
        {"sample": "20 mL from tank"},
        {"sample": "5 g from tank", "to": "vial"},
        {"settle": "2 h", "in": "tank"},
        {"filter": "tank"},
        {"wash": "cake", "with": "50 mL of water", "to": "washings", "retained": "1 mL/g"},
        {"rinse": "cake", "with": "10 mL of water"},
    ).steps[1:]
    first, second, settle, _, wash, rinse = steps
    assert isinstance(first, Transfer)
    assert (first.kind, first.vessel, first.to, first.part_unit) == ("sample", "tank", "sample", "L")
    assert isinstance(second, Transfer)
    assert (second.to, second.part, second.part_unit) == ("vial", Interval(low=5.0, high=5.0), "g")
    assert isinstance(settle, Wait)
    assert (settle.kind, settle.duration) == ("settle", Interval(low=7200.0, high=7200.0))
    assert isinstance(wash, Rinse)
    assert (wash.kind, wash.to, wash.retained) == ("wash", "washings", 1.0)
    assert isinstance(rinse, Rinse)
    assert (rinse.kind, rinse.to) == ("rinse", "")


def test_what_is_written_comes_back():
    case = case_with(
        {"sample": "20 mL from tank", "to": "vial"},
        {"settle": "2 h", "in": "tank"},
        {
            "filter": "tank",
            "cake": "cake",
            "filtrate": "jug",
            "aid": "20 g, 3 mL/g",
            "paper": "500 mg",
            "waste": "bin",
            "passes": "2 %",
            "first_runnings": "200 mL",
            "runnings": "tank",
        },
        {"wash": "cake", "with": "50 mL of water", "to": "washings"},
        {"wipe": "jug", "with": "30 g of paper towel, 4 mL/g", "to": "bin"},
    )
    again = read_case(case_text(case), StandInNames())
    assert case_text(again) == case_text(case)
    assert [type(step) for step in again.steps] == [type(step) for step in case.steps]
    assert again.steps[3] == case.steps[3]
    assert again.steps[5] == case.steps[5]
    assert isinstance(again.steps[3], Filter)
    assert again.steps[3].paper == Absorbent(grams=0.5, material=again.steps[3].paper.material, words="paper")  # type: ignore[union-attr]


@pytest.mark.parametrize(
    ("step", "words"),
    [
        ({"filter": "tank", "aid": "lots"}, "given by its dry weight"),
        ({"filter": "tank", "aid": "20 mL"}, "given by its dry weight"),
        ({"filter": "tank", "aid": "10-20 g"}, "is one figure"),
        ({"filter": "tank", "aid": "20 g, 500 mL/g"}, "holds as much liquid"),
        ({"filter": "tank", "waste": "bin"}, "how much paper"),
        ({"filter": "tank", "paper": "5 g", "waste": "tank"}, "a bin has a name of its own"),
        ({"filter": "tank", "first_runnings": "200 mL"}, "what share of the solids"),
        ({"filter": "tank", "runnings": "beaker", "passes": "2 %"}, "how much are the first runnings"),
        ({"filter": "tank", "cake": "c", "passes": "2 %", "first_runnings": "1 mL", "runnings": "c"}, "into the cake"),
        ({"sample": "tank"}, "how much is taken"),
        ({"sample": "all of tank"}, "how much is taken"),
        ({"sample": "20 mL from tank", "to": "tank"}, "goes into another vessel"),
        ({"sample": "20 mL from tonk"}, "no bottle or vessel 'tonk'"),
        ({"wipe": "tank"}, "needs 'with'"),
        ({"wipe": "tank", "with": "a glove"}, "given by its dry weight"),
        ({"wipe": "tank", "with": "10 g of gloves"}, "how much liquid does the gloves hold"),
        ({"wash": "tank"}, "a wash needs 'with'"),
        ({"wash": "tank", "with": "10 mL of water", "to": "tank"}, "cannot run back"),
        ({"wash": "tank", "with": "10 mL of water", "retained": "1 mL/g"}, "say where 'to'"),
        ({"settle": "0 h", "in": "tank"}, "more than zero"),
    ],
)
def test_what_cannot_be_done_is_refused(step: dict[str, str], words: str):
    with pytest.raises(InputError, match=words):
        case_with(step)
