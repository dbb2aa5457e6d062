"""Mass of each element is conserved over whole procedures, and the account of an element adds up."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from carboy.planning.accounting import account, element_grams, followed, put_in
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory

PORTIONS = (
    "500 mL of (0.02 M mercury(II) nitrate + 0.1 M nitric acid)",
    "20 g of sodium bicarbonate",
    "10 g of sodium carbonate",
    "50 mL of 0.25 M sodium sulfide",
    "300 mL of 0.05 M copper(II) sulfate",
    "100 mL of 1 M sodium hydroxide",
    "50 mL of 6 % sodium hypochlorite",
    "200 mL of (0.01 M potassium dichromate + 0.1 M sulfuric acid)",
    "100 mL of 0.5 M sodium bisulfite",
    "100 mL of 0.5 M ammonia",
    "400 mL of water",
    "2 g of zinc powder",
)
ELEMENTS = ("Hg", "Cu", "Cr", "Zn", "S", "N", "C", "Cl", "Na", "K", "H", "O")
STEPS = (
    {"stir": "30 min", "in": "tank"},
    {"settle": "2 h", "in": "tank"},
    {"stand": "24 h", "in": "tank"},
    {"heat": "60 degC", "in": "tank"},
    {"cool": "10 degC", "in": "tank"},
    {"sample": "5 mL from tank", "to": "vial"},
    {"transfer": "20 mL from tank", "to": "drum"},
    {"transfer": "tank", "to": "drum", "heel": "30 mL"},
    {"add": "10 g from tank", "to": "drum"},
    {"wipe": "tank", "with": "2 g of paper", "to": "bin"},
    {"seal": "tank"},
    {"open": "tank"},
    {"vent": "tank"},
    {"check": "pH between 0 and 14", "in": "tank"},
    {"rinse": "tank", "with": "20 mL of water"},
    {"rinse": "tank", "with": "30 mL of water", "to": "washings"},
    {"decant": "tank", "to": "clear"},
)
ENDINGS = (
    (),
    (
        {"filter": "tank", "cake": "sludge", "filtrate": "jug", "aid": "5 g", "paper": "2 g", "waste": "bin"},
        {"wash": "sludge", "with": "20 mL of water", "to": "washings"},
        {"add": "50 mL of 1 M sodium hydroxide", "to": "jug"},
        {"add": "20 mL of 1 M hydrochloric acid", "to": "sludge"},
    ),
    (
        {
            "filter": "tank",
            "cake": "sludge",
            "filtrate": "jug",
            "passes": "5 %",
            "first_runnings": "50 mL",
            "runnings": "first",
            "retained": "1 mL/g",
        },
        {"seal": "jug"},
        {"wait": "24 h"},
        {"open": "jug"},
    ),
)


def case_of(portions: list[str], between: list[dict[str, str]], ending: tuple[dict[str, str], ...]) -> dict[str, Any]:
    steps: list[dict[str, str]] = []
    for place, text in enumerate(portions):
        steps.append({"add": text, "to": "tank", "over": "10 min"} if place else {"add": text, "to": "tank"})
        if place and between:
            steps.append(between[(place - 1) % len(between)])
    return {
        "title": "random",
        "vessels": {name: {"volume": "10 L", "cover": "open"} for name in ("tank", "drum")},
        "steps": [*steps, *ending],
    }


@settings(max_examples=16, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True)
@given(
    st.lists(st.sampled_from(PORTIONS), min_size=2, max_size=4),
    st.lists(st.sampled_from(STEPS), max_size=3, unique_by=str),
    st.sampled_from(ENDINGS),
)
def test_elements_are_conserved_over_random_procedures(
    portions: list[str], between: list[dict[str, str]], ending: tuple[dict[str, str], ...]
):
    lab = laboratory()
    walk = lab.walk(case_from_mapping(case_of(portions, between, ending), lab.names))
    for element in ELEMENTS:
        found = account(walk, element, lab.stock)
        assert found.gap_share < 1e-9, (element, portions, between, ending)


@pytest.mark.parametrize("step", STEPS, ids=lambda step: next(iter(step)))
def test_each_kind_of_step_conserves(step: dict[str, str]):
    lab = laboratory()
    portions = ["300 mL of 0.05 M copper(II) sulfate", "20 g of sodium bicarbonate", "50 mL of 0.25 M sodium sulfide"]
    walk = lab.walk(case_from_mapping(case_of(portions, [step], ENDINGS[1]), lab.names))
    for element in ("Cu", "S", "C", "H", "O", "Na"):
        assert account(walk, element, lab.stock).gap_share < 1e-9, element


def test_every_gram_of_mercury_is_found():
    """0.080 mol of mercury, 16.05 g (0.080 x 200.59): all but traces in the sludge as sulfide."""
    lab = laboratory()
    data = case_of(
        [
            "4 L of (0.02 M mercury(II) nitrate + 0.1 M nitric acid)",
            "60 g of sodium bicarbonate",
            "60 g of sodium carbonate",
            "168 mL of 0.5 M sodium sulfide",
        ],
        [],
        ({"filter": "tank", "cake": "sludge", "filtrate": "jug"},),
    )
    walk = lab.walk(case_from_mapping(data, lab.names))
    assert put_in(walk, "Hg", lab.stock) == pytest.approx(16.05, rel=2e-3)
    shares = followed(walk, "Hg", lab.stock)
    assert (shares[0].place, shares[0].form) == ("sludge", "HgS")
    assert shares[0].grams == pytest.approx(16.05, rel=2e-3)
    assert sum(share.grams for share in shares) == pytest.approx(put_in(walk, "Hg", lab.stock), rel=1e-6)


def test_gas_that_left_is_counted():
    lab = laboratory()
    data = case_of(["1 L of 1 M hydrochloric acid", "84 g of sodium bicarbonate"], [], ())
    walk = lab.walk(case_from_mapping(data, lab.names))
    air = [share for share in followed(walk, "C", lab.stock) if share.place == "the air"]
    assert [share.form for share in air] == ["CO2"]
    # 1.0 mol of carbon is 12.0 g; what stays dissolved at 1 atm is 0.034 mol/L, 0.4 g
    assert 11.0 < air[0].grams < 12.0
    assert element_grams(walk.vessels["tank"].content, "C", lab.stock) == pytest.approx(12.0 - air[0].grams, abs=0.05)
