"""Formulas: composition, charge, molar mass (against molmass), balance with its table, display."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from molmass import Formula as ReferenceFormula
from molmass.elements import ELEMENTS

from carboy.errors import InputError
from carboy.text.formulas import (
    as_token,
    charge_suffix,
    check_balance,
    elements,
    hill_formula,
    imbalance,
    is_formula,
    molar_mass,
    parse_equation,
    parse_formula,
    parse_sum,
    parse_token,
    plain_formula,
    pretty_equation,
    pretty_formula,
    split_token,
    token_of,
)


@pytest.mark.parametrize(
    ("text", "atoms", "charge"),
    [
        ("NaOH", {"Na": 1, "O": 1, "H": 1}, 0),
        ("Na2S·9H2O", {"Na": 2, "S": 1, "H": 18, "O": 9}, 0),
        ("Na2S.9H2O", {"Na": 2, "S": 1, "H": 18, "O": 9}, 0),
        ("Na2S*9H2O", {"Na": 2, "S": 1, "H": 18, "O": 9}, 0),
        ("Na2S:9H2O", {"Na": 2, "S": 1, "H": 18, "O": 9}, 0),
        ("Na₂S·9H₂O", {"Na": 2, "S": 1, "H": 18, "O": 9}, 0),
        ("Na2S . 9 H2O", {"Na": 2, "S": 1, "H": 18, "O": 9}, 0),
        ("CaSO4.0.5H2O", {"Ca": 1, "S": 1, "O": 4.5, "H": 1}, 0),
        ("CaSO4·½H2O", {"Ca": 1, "S": 1, "O": 4.5, "H": 1}, 0),
        ("2CaSO4·H2O", {"Ca": 2, "S": 2, "O": 9, "H": 2}, 0),
        ("(NH4)2Fe(SO4)2.6H2O", {"N": 2, "H": 20, "Fe": 1, "S": 2, "O": 14}, 0),
        ("Al2O3.2SiO2.2H2O", {"Al": 2, "O": 9, "Si": 2, "H": 4}, 0),
        ("K3[Fe(CN)6]", {"K": 3, "Fe": 1, "C": 6, "N": 6}, 0),
        ("[Co(NH3)6]Cl3", {"Co": 1, "N": 6, "H": 18, "Cl": 3}, 0),
        ("Fe0.95O", {"Fe": 0.95, "O": 1}, 0),
        ("Cu1.8S", {"Cu": 1.8, "S": 1}, 0),
        ("WO2.9", {"W": 1, "O": 2.9}, 0),
        ("CO", {"C": 1, "O": 1}, 0),
        ("Co", {"Co": 1}, 0),
        ("Hg+2", {"Hg": 1}, 2),
        ("Hg2+2", {"Hg": 2}, 2),
        ("SO4-2", {"S": 1, "O": 4}, -2),
        ("SO4^2-", {"S": 1, "O": 4}, -2),
        ("SO₄²⁻", {"S": 1, "O": 4}, -2),
        ("SO42-", {"S": 1, "O": 4}, -2),
        ("Fe3+", {"Fe": 1}, 3),
        ("Hg2+", {"Hg": 1}, 2),
        ("Cu++", {"Cu": 1}, 2),
        ("NH4+", {"N": 1, "H": 4}, 1),
        ("H3O+", {"H": 3, "O": 1}, 1),
        ("NO3-", {"N": 1, "O": 3}, -1),
        ("N3-", {"N": 3}, -1),
        ("I3-", {"I": 3}, -1),
        ("S2-", {"S": 1}, -2),
        ("HPO42-", {"H": 1, "P": 1, "O": 4}, -2),
        ("H2PO4-", {"H": 2, "P": 1, "O": 4}, -1),
        ("Cr2O72-", {"Cr": 2, "O": 7}, -2),
        ("[Fe(CN)6]4-", {"Fe": 1, "C": 6, "N": 6}, -4),
        ("Cu(NH3)42+", {"Cu": 1, "N": 4, "H": 12}, 2),
        ("C12H25SO4-", {"C": 12, "H": 25, "S": 1, "O": 4}, -1),
    ],
)
def test_composition_and_charge(text: str, atoms: dict[str, float], charge: int) -> None:
    formula = parse_formula(text)
    assert formula.atoms == pytest.approx(atoms)
    assert formula.charge == charge


@pytest.mark.parametrize(
    ("token", "atoms", "charge"),
    [
        ("Fe3+", {"Fe": 3}, 1),
        ("S2-", {"S": 2}, -1),
        ("S2-2", {"S": 2}, -2),
        ("NH4+", {"N": 1, "H": 4}, 1),
        ("HgS2-2", {"Hg": 1, "S": 2}, -2),
    ],
)
def test_in_a_token_digits_before_the_sign_are_atoms(token: str, atoms: dict[str, float], charge: int) -> None:
    formula = parse_token(token)
    assert (formula.atoms, formula.charge) == (atoms, charge)


def test_state_and_water() -> None:
    assert parse_formula("H2S(g)").state == "g"
    assert parse_formula("H2S(g)").atoms == {"H": 2, "S": 1}
    assert parse_formula("CuSO4·5H2O").water == 5
    assert parse_formula("H2O").water == 0


def test_ligand_names_in_tokens() -> None:
    groups = {"Edta": {"C": 10.0, "H": 12.0, "N": 2.0, "O": 8.0}, "Acetate": {"C": 2.0, "H": 3.0, "O": 2.0}}
    assert parse_token("H2Edta-2", groups).atoms == {"H": 14, "C": 10, "N": 2, "O": 8}
    assert parse_token("Cu(Acetate)2", groups).atoms == {"Cu": 1, "C": 4, "H": 6, "O": 4}
    with pytest.raises(InputError, match="'Ed' is no element"):
        parse_token("H2Edta-2")


@pytest.mark.parametrize(
    ("text", "column", "message"),
    [
        ("NaXy", 3, "'Xy' is no element"),
        ("Na(OH", 3, "not closed"),
        ("NaOH)", 5, "does not belong"),
        ("sodium", 1, "does not belong"),
        ("2NaCl", 1, "begins with a number"),
        ("", 1, "missing"),
        ("Na2S·xH2O", 6, "does not belong"),
        ("()2", 1, "empty"),
    ],
)
def test_unreadable_formula_points_at_the_fault(text: str, column: int, message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        parse_formula(text)
    assert caught.value.span is not None
    assert caught.value.span.column == column
    assert not is_formula(text)


@given(st.text(max_size=30))
def test_any_text_is_read_or_refused(text: str) -> None:
    if is_formula(text):
        assert parse_formula(text).atoms
    assert isinstance(pretty_formula(text), str)


@given(st.text(alphabet="CHONa()[]·.*+-^0123456789²⁻₂ ", max_size=14))
def test_formula_like_text_is_read_or_refused(text: str) -> None:
    if is_formula(text):
        formula = parse_formula(text)
        assert all(count >= 0 for count in formula.atoms.values())


@pytest.mark.parametrize(
    "text",
    [
        "NaOH",
        "H2SO4",
        "K2Cr2O7",
        "C6H12O6",
        "HgS",
        "KMnO4",
        "Pb(NO3)2",
        "(NH4)2S2O8",
        "C10H16N2O8",
        "AgNO3",
        "CHCl3",
        "As2S3",
        "ZnSO4",
        "UO2(NO3)2",
    ],
)
def test_molar_mass_agrees_with_molmass(text: str) -> None:
    # molmass weighs elements of varying isotopic composition by one best measurement, the table here by IUPAC's
    # conventional values: 1 in 10^4
    assert parse_formula(text).mass == pytest.approx(ReferenceFormula(text).mass, rel=1e-4)


def test_molar_mass_of_a_hydrate() -> None:
    reference = ReferenceFormula("Na2S").mass + 9 * ReferenceFormula("H2O").mass
    assert parse_formula("Na2S·9H2O").mass == pytest.approx(reference, rel=1e-4)


def test_every_standard_atomic_weight_agrees_with_molmass() -> None:
    checked = 0
    for symbol, element in elements().items():
        if element.weight and symbol in ELEMENTS:
            assert element.weight == pytest.approx(ELEMENTS[symbol].mass, rel=7e-4), symbol  # lithium varies most
            assert element.number == ELEMENTS[symbol].number
            checked += 1
    assert checked == 84  # elements with a standard atomic weight


def test_elements_without_a_weight_have_no_molar_mass() -> None:
    with pytest.raises(InputError, match="technetium has no standard atomic weight"):
        molar_mass(parse_formula("TcO2").atoms)


def test_spellings_of_a_formula() -> None:
    assert plain_formula("Na₂S . 9H₂O") == "Na2S·9H2O"
    assert hill_formula(parse_formula("NaHCO3").atoms) == "CHNaO3"
    assert hill_formula(parse_formula("H2SO4").atoms) == "H2O4S"
    assert as_token("SO₄²⁻") == as_token("SO42-") == as_token("SO4^2-") == "SO4-2"
    assert token_of("HS", -1) == "HS-"
    assert split_token("Hg2+2") == ("Hg2", 2)
    assert split_token("acetone") == ("acetone", 0)


@given(st.integers(min_value=-6, max_value=6))
def test_charge_suffix_is_read_back(charge: int) -> None:
    assert split_token("X" + charge_suffix(charge)) == ("X", charge)


@pytest.mark.parametrize(
    ("token", "shown"),
    [
        ("SO4-2", "SO₄²⁻"),
        ("NH4+", "NH₄⁺"),
        ("Hg2+2", "Hg₂²⁺"),
        ("Na2S·9H2O", "Na₂S·9H₂O"),
        ("H2S(g)", "H₂S(g)"),
        ("Cu(NH3)4+2", "Cu(NH₃)₄²⁺"),
        ("Edta-4", "Edta⁴⁻"),
        ("metacinnabar", "metacinnabar"),
        ("zinc-hydroxide", "zinc-hydroxide"),
        ("1-butanol", "1-butanol"),
        ("e-", "e⁻"),
    ],
)
def test_display(token: str, shown: str) -> None:
    assert pretty_formula(token) == shown


def test_equation() -> None:
    equation = parse_equation("Hg+2 + 2 HS- = HgS2-2 + 2 H+")
    assert equation.left == {"Hg+2": 1, "HS-": 2}
    assert equation.right == {"HgS2-2": 1, "H+": 2}
    assert equation.net == {"Hg+2": -1, "HS-": -2, "HgS2-2": 1, "H+": 2}
    assert imbalance(equation.net) == {}
    assert pretty_equation(equation.text) == "Hg²⁺ + 2 HS⁻ ⇌ HgS₂²⁻ + 2 H⁺"


@pytest.mark.parametrize("arrow", ["=", "->", "→", "<=>", "⇌", "-->"])
def test_arrows(arrow: str) -> None:
    assert parse_equation(f"2 H+ + 2 e- {arrow} H2").right == {"H2": 1}


def test_same_species_twice_adds_and_cancels() -> None:
    equation = parse_equation("H+ + H+ + Cl- = H2 + Cl-")
    assert equation.left["H+"] == 2
    assert "Cl-" not in equation.net


def test_coefficients() -> None:
    assert parse_sum("2Na+ + 0.5 O2 + 1/2 H2 + 2-propanol") == {"Na+": 2, "O2": 0.5, "H2": 0.5, "2-propanol": 1}


def test_balance_error_shows_a_table() -> None:
    with pytest.raises(InputError) as caught:
        check_balance(parse_equation("Hg+2 + 2 HS- = HgS2-2 + H+"))
    lines = caught.value.message.splitlines()
    assert lines[0] == "the equation 'Hg+2 + 2 HS- = HgS2-2 + H+' is not balanced"
    rows = {line.split()[0]: line.split()[1:] for line in lines[2:]}
    assert rows["Hg"] == ["1", "1"]
    assert rows["H"][:2] == ["2", "1"]
    assert "differs" in rows["H"]
    assert rows["charge"][:2] == ["0", "-1"]


def test_charge_alone_is_balanced_too() -> None:
    with pytest.raises(InputError, match="not balanced"):
        check_balance(parse_equation("Fe+3 = Fe+2"))
    check_balance(parse_equation("Fe+3 + e- = Fe+2"))


def test_hint_for_charges_written_the_other_way() -> None:
    with pytest.raises(InputError, match=r"write|stands after its sign"):
        check_balance(parse_equation("Fe3+ + e- = Fe+2"))


@pytest.mark.parametrize(
    ("text", "column"),
    [("Hg+2 HS- = HgS + H+", 1), ("HS- + = H2S", 1), ("HS- + H+", 1), ("A = B = C", 1), ("0 H+ = H2", 1)],
)
def test_unreadable_equation_points_at_the_fault(text: str, column: int) -> None:
    with pytest.raises(InputError) as caught:
        parse_equation(text)
    assert caught.value.span is not None
    assert caught.value.span.column == column
