"""Mass of each element is conserved over whole procedures, and the account of an element adds up."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from carboy.planning.accounting import element_grams, followed, put_in
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
ELEMENTS = ("Hg", "Cu", "Cr", "Zn", "S", "N", "C", "Cl", "Na", "K")
AFTER = ("stir", "filter", "transfer", "decant", "nothing")


def case_of(portions: list[str], ending: str) -> dict[str, Any]:
    steps: list[dict[str, str]] = [{"add": text, "to": "tank"} for text in portions]
    if ending == "stir":
        steps.append({"stir": "30 min", "in": "tank"})
    elif ending in ("filter", "decant"):
        steps.append({ending: "tank", "cake": "sludge", "filtrate": "jug"})
        steps.append({"add": "50 mL of 1 M sodium hydroxide", "to": "jug"})
    elif ending == "transfer":
        steps.append({"transfer": "tank", "to": "drum"})
    return {
        "title": "random",
        "vessels": {name: {"volume": "10 L", "cover": "open"} for name in ("tank", "drum")},
        "steps": steps,
    }


@settings(max_examples=12, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True)
@given(st.lists(st.sampled_from(PORTIONS), min_size=2, max_size=4), st.sampled_from(AFTER))
def test_elements_are_conserved_over_random_procedures(portions: list[str], ending: str):
    lab = laboratory()
    walk = lab.walk(case_from_mapping(case_of(portions, ending), lab.names))
    for element in ELEMENTS:
        came = put_in(walk, element, lab.stock)
        there = sum(entry.grams for entry in followed(walk, element, lab.stock))
        assert there == pytest.approx(came, rel=1e-4, abs=1e-6), (element, portions, ending)


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
        "filter",
    )
    walk = lab.walk(case_from_mapping(data, lab.names))
    assert put_in(walk, "Hg", lab.stock) == pytest.approx(16.05, rel=2e-3)
    shares = followed(walk, "Hg", lab.stock)
    assert (shares[0].place, shares[0].form) == ("sludge", "HgS")
    assert shares[0].grams == pytest.approx(16.05, rel=2e-3)
    assert sum(share.grams for share in shares) == pytest.approx(put_in(walk, "Hg", lab.stock), rel=1e-6)


def test_gas_that_left_is_counted():
    lab = laboratory()
    data = case_of(["1 L of 1 M hydrochloric acid", "84 g of sodium bicarbonate"], "nothing")
    walk = lab.walk(case_from_mapping(data, lab.names))
    air = [share for share in followed(walk, "C", lab.stock) if share.place == "the air"]
    assert [share.form for share in air] == ["CO2"]
    # 1.0 mol of carbon is 12.0 g; what stays dissolved at 1 atm is 0.034 mol/L, 0.4 g
    assert 11.0 < air[0].grams < 12.0
    assert element_grams(walk.vessels["tank"].content, "C", lab.stock) == pytest.approx(12.0 - air[0].grams, abs=0.05)
