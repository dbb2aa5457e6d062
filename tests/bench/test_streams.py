"""Streams of a separation: what stays in a cake, in filter aid, in paper, what passes, what is washed out, sampled, wiped up or left.

Sodium is the tracer of the liquid: it is in no solid here. Worked by hand for 0.100 mol of copper as Cu(OH)2, 97.56 g/mol:
  tank           2.0 L + 0.4 L = 2.40 L with 0.800 mol of Na, 9.756 g of solid
  sample         20 mL: 1/120 of everything; 2.38 L, 0.7933 mol of Na and 9.675 g of solid are left
  decant         20 mL/g x 9.675 g = 193.5 mL stay, with 0.7933 x 193.5 / 2380 = 0.06450 mol of Na
  water          + 300 mL: 493.5 mL, Na 0.1307 M
  filter         cake 2 mL/g x 9.675 g = 19.35 mL and 20 g of aid 50 mL: 69.35 mL, Na 0.009064 mol
                 paper 5 g x 2 mL/g = 10 mL, Na 0.001307 mol; first runnings 100 mL, Na 0.01307 mol; jug the rest, 314.1 mL, 0.04106 mol
                 2 % of the solid passes, all of it in the first runnings: 0.09917 x 0.02 = 0.001983 mol of Cu
  wash           69.35 + 50 = 119.35 mL; the cake (9.481 g) keeps 18.96 + 50 = 68.96 mL: Na 0.009064 x 68.96 / 119.35 = 0.005237 mol
  heel           100 mL of 2186.5 mL of clear liquid: 0.7933 - 0.0645 = 0.7288 mol of Na, of which 0.03333 stays
  wipe           30 g x 3 mL/g = 90 mL of the 100 mL: 0.0300 mol of Na
"""

from __future__ import annotations

from typing import Any

import pytest

from carboy.bench.walk import Walk
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory

BEGINNING: list[dict[str, str]] = [
    {"add": "2 L of (0.05 M copper sulfate + 0.1 M sulfuric acid)", "to": "tank"},
    {"add": "400 mL of 2 M sodium hydroxide", "to": "tank", "over": "20 min"},
]
ALL: list[dict[str, str]] = [
    *BEGINNING,
    {"sample": "20 mL from tank", "to": "vial"},
    {"settle": "12 h", "in": "tank"},
    {"decant": "tank", "to": "clear"},
    {"add": "300 mL of water", "to": "tank"},
    {
        "filter": "tank",
        "cake": "cake",
        "filtrate": "jug",
        "aid": "20 g",
        "paper": "5 g",
        "waste": "bin",
        "passes": "2 %",
        "first_runnings": "100 mL",
        "runnings": "first",
    },
    {"wash": "cake", "with": "50 mL of water", "to": "washings"},
    {"transfer": "clear", "to": "drum", "heel": "100 mL"},
    {"wipe": "clear", "with": "30 g of paper towel, 3 mL/g", "to": "bin"},
]


def walked(steps: list[dict[str, str]]) -> Walk:
    lab = laboratory()
    data: dict[str, Any] = {
        "title": "streams",
        "vessels": {"tank": {"volume": "10 L"}, "drum": {"volume": "10 L"}},
        "steps": steps,
    }
    return lab.walk(case_from_mapping(data, lab.names))


def moles(walk: Walk, vessel: str, token: str, step: int | None = None) -> float:
    page = walk.ledger[-1 if step is None else step]
    return float(page.contents[vessel].total(token)[0]) if vessel in page.contents else 0.0


@pytest.fixture(scope="module")
def whole() -> Walk:
    return walked(ALL)


def test_a_sample_takes_its_share(whole: Walk):
    assert moles(whole, "vial", "Na+") == pytest.approx(0.8 / 120, rel=1e-3)
    assert moles(whole, "vial", "Cu+2") == pytest.approx(0.1 / 120, rel=1e-3)


def test_a_settled_sludge_keeps_its_liquid(whole: Walk):
    assert moles(whole, "tank", "Na+", 5) == pytest.approx(0.06450, rel=3e-3)
    assert moles(whole, "tank", "Cu+2", 5) == pytest.approx(0.09917, rel=1e-3)


def test_cake_with_filter_aid(whole: Walk):
    assert moles(whole, "cake", "Na+", 7) == pytest.approx(0.009064, rel=5e-3)
    assert whole.vessels["cake"].stream == "cake"
    assert whole.vessels["cake"].carriers == {"filter aid": (20.0, 50.0)}


def test_paper_is_a_stream_of_its_own(whole: Walk):
    assert moles(whole, "bin", "Na+", 7) == pytest.approx(0.001307, rel=5e-3)
    assert whole.vessels["bin"].stream == "contaminated solid"
    assert whole.vessels["bin"].spec.material == laboratory().names.container("paper")


def test_first_runnings_hold_all_that_passes(whole: Walk):
    assert moles(whole, "first", "Na+") == pytest.approx(0.01307, rel=5e-3)
    assert moles(whole, "first", "Cu+2") == pytest.approx(0.001983, rel=5e-3)
    assert moles(whole, "jug", "Na+") == pytest.approx(0.04106, rel=5e-3)
    assert moles(whole, "jug", "Cu+2") < 1e-5


def test_washings_run_off_and_the_cake_keeps_its_share(whole: Walk):
    assert moles(whole, "cake", "Na+") == pytest.approx(0.005237, rel=5e-3)
    assert moles(whole, "washings", "Na+") == pytest.approx(0.009064 - 0.005237, rel=1e-2)
    assert whole.vessels["washings"].stream == "washings"


def test_heel_and_wipe(whole: Walk):
    assert moles(whole, "clear", "Na+", 9) == pytest.approx(0.03333, rel=5e-3)
    assert moles(whole, "bin", "Na+") == pytest.approx(0.001307 + 0.0300, rel=5e-3)
    assert moles(whole, "clear", "Na+") == pytest.approx(0.003333, rel=2e-2)


def test_what_is_taken_to_be_is_said(whole: Walk):
    said = " ".join(whole.assumptions)
    assert "20 g of filter aid takes 50 mL of liquid along to the cake (2.5 mL per g, common practice)" in said
    assert "30 g of paper towel takes 90 mL of liquid along to bin (3 mL per g, as the case says)" in said


def test_decanting_before_it_has_settled_takes_the_solids_along():
    walk = walked([*BEGINNING, {"decant": "tank", "to": "clear"}])
    # the 195 mL that are left of 2400 mL hold their share of the solids: 0.1 x 195 / 2400
    assert moles(walk, "tank", "Cu+2") == pytest.approx(0.00813, rel=5e-3)
    assert moles(walk, "clear", "Cu+2") == pytest.approx(0.09187, rel=5e-3)
    assert any("had not settled" in line for line in walk.assumptions)
    stirred = walked([*BEGINNING, {"settle": "2 h", "in": "tank"}, {"stir": "5 min", "in": "tank"}, {"decant": "tank"}])
    assert any("had not settled" in line for line in stirred.assumptions)


def test_first_runnings_may_be_poured_back():
    walk = walked(
        [
            *BEGINNING,
            {
                "filter": "tank",
                "cake": "cake",
                "filtrate": "jug",
                "passes": "2 %",
                "first_runnings": "100 mL",
                "runnings": "tank",
            },
            {"filter": "tank", "cake": "cake", "filtrate": "jug"},
        ]
    )
    assert moles(walk, "tank", "Cu+2", 3) == pytest.approx(0.002, rel=5e-3)
    assert moles(walk, "cake", "Cu+2") == pytest.approx(0.1, rel=1e-3)


def test_grams_of_a_vessel_are_grams():
    """100 g of about 2.5 kg, not 100 L."""
    walk = walked([*BEGINNING, {"add": "100 g from tank", "to": "drum"}])
    mass = float(walk.ledger[2].contents["tank"].mass_g[0])
    assert moles(walk, "drum", "Na+") == pytest.approx(0.8 * 100 / mass, rel=1e-6)
    assert 2400 < mass < 2600


def test_more_than_there_is_empties_the_vessel_and_says_so():
    walk = walked([*BEGINNING, {"transfer": "5 L from tank", "to": "drum"}])
    assert moles(walk, "drum", "Na+") == pytest.approx(0.8, rel=1e-6)
    assert any("all of it is taken" in line for line in walk.assumptions)


def test_acid_in_paper_is_found():
    """Strong nitric acid in paper: the bin is judged as paper, on which nitric acid acts."""
    lab = laboratory()
    data = {
        "title": "paper",
        "vessels": {"beaker": {"volume": "1 L"}},
        "steps": [
            {"add": "100 mL of concentrated nitric acid", "to": "beaker"},
            {"wipe": "beaker", "with": "20 g of paper", "to": "bin"},
        ],
    }
    report = lab.vet(case_from_mapping(data, lab.names))
    assert any(finding.vessel == "bin" and finding.kind in ("attack", "fire") for finding in report.findings)


def test_waiting_with_two_full_vessels_is_vetted():
    lab = laboratory()
    steps = [*BEGINNING, {"add": "1 L of water", "to": "drum"}, {"wait": "24 h"}]
    data = {"title": "wait", "vessels": {"tank": {"volume": "10 L"}, "drum": {"volume": "10 L"}}, "steps": steps}
    report = lab.vet(case_from_mapping(data, lab.names), hold_points=True)
    assert [step.vessel for step in report.steps if step.step == 4] == ["tank", "drum"]


def test_gloves_are_a_stream_too():
    """50 g of gloves with 0.2 mL on each g: 10 mL of 2.4 L, 0.8 x 10 / 2400 mol of Na; they are judged as what they are made of."""
    walk = walked([*BEGINNING, {"wipe": "tank", "with": "50 g of nitrile gloves, 0.2 mL/g", "to": "glove bag"}])
    bag = walk.vessels["glove bag"]
    assert moles(walk, "glove bag", "Na+") == pytest.approx(0.8 * 10 / 2400, rel=1e-3)
    assert bag.stream == "contaminated solid"
    assert bag.spec.material == laboratory().names.container("nitrile rubber")
