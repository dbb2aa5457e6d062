"""Folding of names: spellings of one name fold alike, names of two things never."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from carboy.knowledge.cas import check_digit_fits, has_cas_form
from carboy.knowledge.folding import fold


@pytest.mark.parametrize(
    "spellings",
    [
        (
            "mercury(II) nitrate",
            "Mercury (ii) Nitrate",
            "mercury II nitrate",
            "mercury-ii-nitrate",
            "mercury(2+) nitrate",
        ),
        ("sodium sulfide", "Sodium Sulphide", "sodium-sulfide", "SODIUM  SULFIDE"),
        ("aluminium chloride", "aluminum chloride"),
        ("caesium iodide", "cesium iodide"),
        ("sulfuric acid", "sulphuric acid"),
        ("Fehling's solution", "Fehling solution", "Fehling’s solution"),
        ("1,2-dichloroethane", "1,2-Dichloroethane", "1,2 dichloroethane"),
        ("α-pinene", "alpha-pinene", "alpha pinene"),
        ("Glaubersalz", "glaubersalz"),
        ("ionised water", "ionized water"),
        ("iron(II,III) oxide", "Iron (ii, iii) oxide"),
        ("poly(vinyl alcohol)", "polyvinyl alcohol"),
        ("crème", "creme"),
    ],
)
def test_spellings_of_one_name(spellings: tuple[str, ...]) -> None:
    assert len({fold(name) for name in spellings}) == 1


@pytest.mark.parametrize(
    "names",
    [
        ("sodium sulfide", "sodium sulfite", "sodium sulfate"),
        ("mercury(I) nitrate", "mercury(II) nitrate", "mercury nitrate"),
        ("sodium chlorite", "sodium chlorate", "sodium chloride", "sodium perchlorate", "sodium hypochlorite"),
        ("copper(I) iodide", "copper(II) iodide"),
        ("sodium nitrite", "sodium nitrate"),
        ("1,2-dichloroethane", "1,1-dichloroethane"),
        ("phosphorous acid", "phosphoric acid"),
        ("propan-1-ol", "propan-2-ol"),
        ("chromium(III) oxide", "chromium(VI) oxide"),
    ],
)
def test_names_of_different_things(names: tuple[str, ...]) -> None:
    assert len({fold(name) for name in names}) == len(names)


@given(st.text(max_size=40))
def test_case_and_spaces_never_matter(name: str) -> None:
    assert fold(name) == fold(f"  {name} ")
    assert ":" not in fold(name)


@pytest.mark.parametrize("number", ["7732-18-5", "7647-14-5", "1313-84-4", "7664-93-9", "67-64-1"])
def test_check_digits_of_known_numbers(number: str) -> None:
    assert check_digit_fits(number)
    wrong = number[:-1] + str((int(number[-1]) + 1) % 10)
    assert has_cas_form(wrong)
    assert not check_digit_fits(wrong)


@pytest.mark.parametrize("text", ["2-propanol", "7732-18", "12345678-12-1", "77-3218-5", "7732-18-55", ""])
def test_what_is_not_written_like_a_cas_number(text: str) -> None:
    assert not has_cas_form(text)
    assert not check_digit_fits(text)
