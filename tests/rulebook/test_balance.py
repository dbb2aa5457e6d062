"""Coefficients from elements and charge."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from carboy.chemistry.balance import Formula, balance, imbalance
from carboy.errors import RuleError

H, H2, H2O, OH = ({"H": 1.0}, 1), ({"H": 2.0}, 0), ({"H": 2.0, "O": 1.0}, 0), ({"H": 1.0, "O": 1.0}, -1)
MNO4, MN = ({"Mn": 1.0, "O": 4.0}, -1), ({"Mn": 1.0}, 2)
H2O2, O2 = ({"H": 2.0, "O": 2.0}, 0), ({"O": 2.0}, 0)


def _metal(symbol: str, charge: int = 0) -> Formula:
    return {symbol: 1.0}, charge


@pytest.mark.parametrize(
    ("reactants", "products", "expected"),
    [
        ([_metal("Zn"), H], [_metal("Zn", 2), H2], [1, 2, 1, 1]),
        ([_metal("Al"), H], [_metal("Al", 3), H2], [2, 6, 2, 3]),
        ([MNO4, H, _metal("Fe", 2)], [MN, _metal("Fe", 3), H2O], [1, 8, 5, 1, 5, 4]),
        # dichromate and ethanol to acetic acid
        (
            [({"Cr": 2.0, "O": 7.0}, -2), H, ({"C": 2.0, "H": 6.0, "O": 1.0}, 0)],
            [_metal("Cr", 3), ({"C": 2.0, "H": 4.0, "O": 2.0}, 0), H2O],
            [2, 16, 3, 4, 3, 11],
        ),
        ([_metal("Al"), OH, H2O], [({"Al": 1.0, "O": 4.0, "H": 4.0}, -1), H2], [2, 2, 6, 2, 3]),
        ([({"C": 1.0, "N": 0.5}, 0)], [({"C": 2.0, "N": 1.0}, 0)], [2, 1]),
    ],
)
def test_equations_with_one_solution(reactants: list[Formula], products: list[Formula], expected: list[int]) -> None:
    assert balance(reactants, products) == tuple(map(Fraction, expected))


def test_peroxide_and_permanganate_need_two_written_coefficients() -> None:
    with pytest.raises(RuleError, match="more than one set"):
        balance([MNO4, H, H2O2], [MN, O2, H2O])
    assert balance([MNO4, H, H2O2], [MN, O2, H2O], fixed={0: 2, 2: 5}) == (2, 6, 5, 2, 5, 8)
    with pytest.raises(RuleError, match="no coefficients balance the equation with those"):
        balance([_metal("Zn"), H], [_metal("Zn", 2), H2], fixed={0: 1, 1: 3})


def test_a_written_fraction_scales_the_others() -> None:
    assert balance([H2, O2], [H2O], fixed={1: 0.5}) == (1, Fraction(1, 2), 1)


@pytest.mark.parametrize(
    ("reactants", "products", "words"),
    [
        ([_metal("Zn")], [_metal("Cu")], "no coefficients balance"),
        ([_metal("Zn")], [_metal("Zn", 2)], "no coefficients balance"),
        ([H2O, H2], [O2], "all positive"),
        ([H2, O2, _metal("Zn")], [H2O], "all positive"),
    ],
)
def test_equations_without_a_solution(reactants: list[Formula], products: list[Formula], words: str) -> None:
    with pytest.raises(RuleError, match=words):
        balance(reactants, products)


_FORMULAS = st.tuples(
    st.dictionaries(st.sampled_from("HCNOS"), st.integers(1, 6).map(float), min_size=1), st.integers(-3, 3)
)


@given(st.lists(_FORMULAS, min_size=1, max_size=3), st.lists(_FORMULAS, min_size=1, max_size=3))
def test_what_is_balanced_keeps_every_element_and_the_charge(reactants: list[Formula], products: list[Formula]) -> None:
    try:
        counts = [float(value) for value in balance(reactants, products)]
    except RuleError:
        return
    assert min(counts) >= 1
    left = list(zip(counts, reactants, strict=False))
    right = list(zip(counts[len(reactants) :], products, strict=True))
    assert imbalance(left, right) == {}


def test_imbalance_names_elements_and_charge() -> None:
    assert imbalance([(1, _metal("Zn")), (1, H)], [(1, _metal("Zn", 2)), (1, H2)]) == {"H": 1.0, "charge": 1.0}
