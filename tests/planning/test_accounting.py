"""The account of an element: what was put in, where it is, and that the two agree."""

from __future__ import annotations

from typing import Any

import pytest

from carboy.errors import InputError
from carboy.planning.accounting import account, element_symbol
from carboy.reports.accounting import account_lines, grams_text
from carboy.reports.style import Style
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory

# 4 L x 0.020 M of mercury: 0.080 mol x 200.59 g/mol = 16.05 g
MERCURY: dict[str, Any] = {
    "title": "mercury",
    "vessels": {"tank": {"volume": "20 L"}},
    "steps": [
        {"add": "4 L of (0.02 M mercury(II) nitrate + 0.1 M nitric acid)", "to": "tank"},
        {"add": "60 g of sodium bicarbonate", "to": "tank"},
        {"add": "60 g of sodium carbonate", "to": "tank"},
        {"add": "168 mL of 0.5 M sodium sulfide", "to": "tank"},
        {"sample": "40 mL from tank", "to": "vial"},
        {"stand": "24 h", "in": "tank"},
        {"filter": "tank", "cake": "sludge", "filtrate": "jug", "paper": "10 g", "waste": "bin"},
    ],
}


@pytest.mark.parametrize("words", ["Hg", "hg", "mercury", "Mercury "])
def test_an_element_goes_by_name_and_symbol(words: str):
    assert element_symbol(words) == "Hg"


@pytest.mark.parametrize(
    ("words", "meant"), [("mercry", "mercury"), ("chromum", "chromium"), ("aluminum", "aluminium")]
)
def test_near_misses_are_suggested(words: str, meant: str):
    with pytest.raises(InputError) as caught:
        element_symbol(words)
    assert meant in caught.value.suggestions


def test_the_account_of_mercury():
    """Of 16.05 g the sample of 40 mL in 4.17 L and the room of 120 g of salts takes 0.95 %: 0.152 g; the rest is sludge, but for traces."""
    lab = laboratory()
    walk = lab.walk(case_from_mapping(MERCURY, lab.names))
    found = account(walk, "Hg", lab.stock)
    assert found.put_in_g[0] == pytest.approx(16.05, rel=2e-3)
    assert found.gap_share < 1e-9
    first, second = found.shares[:2]
    assert (first.place, first.stream, first.state, first.form) == ("sludge", "cake", "solid", "HgS")
    assert first.percent == pytest.approx(99.05, abs=0.03)
    assert (second.place, second.stream) == ("vial", "sample")
    assert second.nominal_g == pytest.approx(0.152, rel=1e-2)
    bin_share = next(share for share in found.shares if share.place == "bin")
    assert (bin_share.stream, bin_share.carrier) == ("contaminated solid", "10 g of paper")
    assert [step.step for step in found.steps] == [1, 2, 3, 4, 5, 6, 7]
    assert set(found.steps[0].grams) == {"tank"}
    assert "tank" not in found.steps[-1].grams


@pytest.mark.parametrize("element", ["H", "C", "N", "O", "Na", "S", "Hg"])
def test_every_balance_closes(element: str):
    lab = laboratory()
    walk = lab.walk(case_from_mapping(MERCURY, lab.names))
    assert account(walk, element, lab.stock).gap_share < 1e-9


def test_what_a_vessel_held_at_the_start_is_put_in():
    lab = laboratory()
    data = {
        "title": "held",
        "vessels": {"tank": {"volume": "5 L", "holds": ["1 L of 0.1 M sodium chloride"]}},
        "steps": [{"add": "1 L of 0.1 M sodium chloride", "to": "tank"}],
    }
    found = account(lab.walk(case_from_mapping(data, lab.names)), "Cl", lab.stock)
    assert found.put_in_g[0] == pytest.approx(0.2 * 35.45, rel=1e-3)
    assert found.steps[0].step == 0
    assert found.gap_share < 1e-9


def test_ranges_are_told():
    lab = laboratory()
    data = {"title": "range", "steps": [{"add": "1 L of 10-50 g/L copper sulfate"}]}
    found = account(lab.walk(case_from_mapping(data, lab.names)), "Cu", lab.stock)
    # the blue salt with its five waters, 249.68 g/mol: 63.546 / 249.68 of it
    assert found.put_in_g == pytest.approx((2.545, 12.73), rel=2e-3)
    text = "\n".join(account_lines(found, Style(80, plain=True)))
    assert "by the labels 2.55 g to 12.7 g" in text


def test_an_element_that_is_not_there():
    lab = laboratory()
    found = account(lab.walk(case_from_mapping(MERCURY, lab.names)), "Au", lab.stock)
    assert "There is no gold in this procedure." in "\n".join(account_lines(found, Style(80, plain=True)))


@pytest.mark.parametrize(
    ("grams", "text"), [(24.07, "24.1 g"), (0.0529, "52.9 mg"), (1.83e-5, "18.3 µg"), (4e-9, "4 ng"), (0.0, "0 g")]
)
def test_grams_in_a_handy_unit(grams: float, text: str):
    assert grams_text(grams) == text
