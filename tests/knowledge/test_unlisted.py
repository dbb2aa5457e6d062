"""Structures on a label, end to end: listed ones are recognised, others become substances of that run only."""

from __future__ import annotations

import pytest

from carboy.errors import InputError
from carboy.knowledge.index import load_index
from carboy.knowledge.names import Names
from carboy.knowledge.unlisted import Admitted, admit
from carboy.model.knowledge import Substance
from carboy.text.cases import combine_case
from carboy.vetting import Laboratory

INDEX = load_index()
NAMES = Names(INDEX)
LAB = Laboratory(INDEX)
SOLVENT = "10 mL of hexane"


def admitted(portion: str) -> Admitted:
    return admit(combine_case((portion, SOLVENT), NAMES, None, None), INDEX)


def made(portion: str) -> Substance:
    """The one substance that a portion adds to the index."""
    found = admitted(portion)
    (identity,) = found.index.substances.keys() - INDEX.substances.keys()
    return found.index.substances[identity]


def first_reference(portion: str) -> str:
    step = admitted(portion).case.steps[0]
    return step.portion.ingredients[0].reference  # type: ignore[union-attr]


@pytest.mark.parametrize(
    ("smiles", "substance"),
    [
        ("CC(=O)C", "acetone"),
        ("O=C(C)C", "acetone"),
        ("OCC", "ethanol"),
        ("c1ccccc1", "benzene"),
        ("C1=CC=CC=C1", "benzene"),
        ("[Na+].[Cl-]", "sodium-chloride"),
        ("OO", "hydrogen-peroxide"),
        ("C/C=C/C=O", "crotonaldehyde"),
        ("CC=CC=O", "crotonaldehyde"),
    ],
)
def test_a_listed_structure_is_recognised(smiles: str, substance: str) -> None:
    assert first_reference(f"10 mL of SMILES {smiles}") == f"substance:{substance}"
    assert admitted(f"10 mL of SMILES {smiles}").index is INDEX


def test_a_mirror_image_is_taken_for_the_listed_one_and_said_to_differ() -> None:
    found = admitted("10 g of SMILES C[C@@H](O)C(=O)O")
    assert first_reference("10 g of SMILES C[C@@H](O)C(=O)O") == "substance:lactic-acid"
    assert any("stereochemistry" in note for note in found.notes)


def test_isomers_about_a_double_bond_that_are_both_listed_are_kept_apart() -> None:
    assert first_reference(r"1 g of SMILES OC(=O)/C=C\C(=O)O") == "substance:maleic-acid"
    assert first_reference(r"1 g of SMILES OC(=O)/C=C/C(=O)O") == "substance:fumaric-acid"


def test_an_unlisted_molecule_becomes_a_substance_of_that_run() -> None:
    item = made("10 mL of SMILES CCC(C)OC(C)CC")
    assert item.atoms == {"C": 8.0, "H": 18.0, "O": 1.0}
    assert (item.state, item.yields) == ("l", {item.id: 1.0})
    assert "branched-peroxidisable-ether" in item.classes
    assert item.id not in INDEX.substances
    assert item.id not in INDEX.species


@pytest.mark.parametrize(("words", "state"), [("", "l"), (" powder", "s"), (" crystals", "s"), (" gas", "g")])
def test_state_is_liquid_unless_the_label_says_so(words: str, state: str) -> None:
    unit = "10 g of"
    form = words.strip()
    assert made(f"{unit} {form + ' ' if form else ''}SMILES CCC(C)OC(C)CC").state == state


def test_two_ways_to_write_a_structure_are_one_substance() -> None:
    case = combine_case(("1 mL of SMILES CCCCCCCOC", "1 mL of SMILES COCCCCCCC"), NAMES, None, None)
    assert len(admit(case, INDEX).index.substances) == len(INDEX.substances) + 1


def test_a_salt_of_a_listed_acid_gives_its_ions() -> None:
    item = made("1 g of SMILES [Cs+].CCC(=O)[O-]")
    assert item.yields == {"Cs+": 1.0, "Propionate-": 1.0}


def test_the_hydrochloride_of_an_unlisted_amine_is_no_free_acid() -> None:
    item = made("1 g of SMILES CCCCCCCCNC.Cl")
    charges = {token: admitted("1 g of SMILES CCCCCCCCNC.Cl").index.species[token].charge for token in item.yields}
    assert sorted(charges.values()) == [-1, 1]
    assert "H+" not in item.yields


def test_a_salt_of_an_unlisted_ion_keeps_its_charge_balance() -> None:
    portion = "1 g of SMILES CCCCCC[N+](C)(C)C.[Br-]"
    found = admitted(portion)
    item = made(portion)
    assert sum(count * found.index.species[token].charge for token, count in item.yields.items()) == 0
    report = LAB.combine((portion, "100 mL of water"))
    low, high = report.steps[-1].pH if isinstance(report.steps[-1].pH, tuple) else (report.steps[-1].pH,) * 2
    assert 6.5 < low <= high < 7.5


@pytest.mark.parametrize(
    ("smiles", "words"),
    [
        ("C(C)(C)(C)(C)C", "5 bonds"),
        ("C1CCC", "not complete"),
        ("CC[NH3+]", "counter-ion"),
        ("CCCCCCCCC.CCCCCCCCCCO", "side by side"),
        ("[Pu]", "metal or an element"),
    ],
)
def test_what_is_no_substance_is_an_error_at_its_place(smiles: str, words: str) -> None:
    with pytest.raises(InputError, match=words) as caught:
        LAB.combine((f"10 mL of SMILES {smiles}", SOLVENT))
    assert caught.value.span is not None
    assert smiles in caught.value.span.text


def test_an_unlisted_structure_is_judged_by_its_classes() -> None:
    report = LAB.combine(("200 mL of SMILES CCC(C)OC(C)CC", "100 mL of hexane"))
    assert any(one.kind == "explosive" and "peroxide-former-in-air" in one.rules for one in report.findings)
    assert any("not listed" in line and "branched peroxidisable ether" in line for line in report.assumptions)
    assert any("density unknown" in line for line in report.assumptions)


def test_a_harmless_unlisted_structure_raises_nothing() -> None:
    report = LAB.combine(("10 mL of SMILES CCCCCCCCC(C)CC", "10 mL of hexane"))
    assert report.verdict == "no objection"


def test_an_unlisted_acid_chloride_meets_water_as_a_listed_one_does() -> None:
    def found(portion: str) -> set[tuple[str, str]]:
        report = LAB.combine((portion, "100 mL of water"))
        return {(one.kind, rule) for one in report.findings for rule in one.rules}

    listed = found("0.1 mol of propionyl chloride")
    assert ("toxic-gas", "water-on-acid-chloride") in listed
    assert found("0.1 mol of SMILES CCCCCC(=O)Cl") == listed


def test_nothing_stays_behind_in_the_laboratory() -> None:
    before = (len(LAB.index.substances), len(LAB.index.species), len(LAB.stock.classes))
    LAB.combine(("10 mL of SMILES CCCCCOCCCCC", SOLVENT))
    assert (len(LAB.index.substances), len(LAB.index.species), len(LAB.stock.classes)) == before
    assert LAB.prepared(combine_case((SOLVENT, SOLVENT), NAMES, None, None))[0] is LAB


def test_a_structure_as_solvent() -> None:
    report = LAB.combine(("100 mL of 1 M acetic acid in SMILES CCCCOCC", SOLVENT))
    assert not report.unrecognised
