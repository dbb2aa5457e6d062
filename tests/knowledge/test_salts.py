"""Salts that the graph does not list: formulas and names as sums of ions, and what must not be taken for a salt."""

from __future__ import annotations

import pytest

from carboy.knowledge.index import load_index
from carboy.knowledge.names import Names
from carboy.knowledge.salts import SaltReader
from carboy.text.formulas import parse_formula, parse_sum
from carboy.vetting import Laboratory

INDEX = load_index()
READER = SaltReader(INDEX)
NAMES = Names(INDEX)

FORMULAS = [
    ("K2Cr2O7", "2 K+ + Cr2O7-2", 0),
    ("Co(NO3)2·6H2O", "Co+2 + 2 NO3-", 6),
    ("Co(ClO3)2.6H2O", "Co+2 + 2 ClO3-", 6),
    ("NaHSe", "Na+ + HSe-", 0),
    ("Rb2SO4", "2 Rb+ + SO4-2", 0),
    ("NaHSO4", "Na+ + HSO4-", 0),
    ("KH2PO4", "K+ + H2PO4-", 0),
    ("Na2HPO4·12H2O", "2 Na+ + HPO4-2", 12),
    ("Fe4[Fe(CN)6]3", "4 Fe+3 + 3 Fe(CN)6-4", 0),
    ("K4Fe(CN)6", "4 K+ + Fe(CN)6-4", 0),
    ("K3Fe(CN)6", "3 K+ + Fe(CN)6-3", 0),
    ("(NH4)2Fe(SO4)2·6H2O", "2 NH4+ + Fe+2 + 2 SO4-2", 6),
    ("KAl(SO4)2·12H2O", "K+ + Al+3 + 2 SO4-2", 12),
    ("K2SO4·Al2(SO4)3·24H2O", "2 K+ + 2 Al+3 + 4 SO4-2", 24),
    ("Hg2(NO3)2", "Hg2+2 + 2 NO3-", 0),
    ("Hg(NO3)2", "Hg+2 + 2 NO3-", 0),
    ("FeBr2", "Fe+2 + 2 Br-", 0),
    ("FeBr3", "Fe+3 + 3 Br-", 0),
    ("CuBr", "Cu+ + Br-", 0),
    ("K2MnO4", "2 K+ + MnO4-2", 0),
    ("Ba(MnO4)2", "Ba+2 + 2 MnO4-", 0),
    ("CH3COORb", "Rb+ + Acetate-", 0),
    ("(CH3COO)2Sr", "Sr+2 + 2 Acetate-", 0),
    ("Sr(HCOO)2", "Sr+2 + 2 Formate-", 0),
    ("NaKC4H4O6", "Na+ + K+ + Tartrate-2", 0),
    ("[Co(NH3)6]Cl3", "Co(NH3)6+3 + 3 Cl-", 0),
    ("K2[HgI4]", "2 K+ + HgI4-2", 0),
    ("UO2(NO3)2·6H2O", "UO2+2 + 2 NO3-", 6),
    ("AgOCN", "Ag+ + OCN-", 0),
    ("CsSCN", "Cs+ + SCN-", 0),
    ("Rb₂CrO₄", "2 Rb+ + CrO4-2", 0),
    ("KI3", "K+ + I3-", 0),
    ("N2H5Cl", "N2H5+ + Cl-", 0),
    ("HBrO3", "BrO3- + H+", 0),
]

NAMED = [
    ("cobalt(II) chlorate", "Co+2 + 2 ClO3-"),
    ("Cobalt (II) Chlorate", "Co+2 + 2 ClO3-"),
    ("cobaltous chlorate", "Co+2 + 2 ClO3-"),
    ("rubidium azide", "Rb+ + N3-"),
    ("iron(III) perchlorate", "Fe+3 + 3 ClO4-"),
    ("ferric perchlorate", "Fe+3 + 3 ClO4-"),
    ("mercury(I) bromate", "Hg2+2 + 2 BrO3-"),
    ("thallium(I) bromate", "Tl+ + BrO3-"),
    ("caesium hydrogen sulphate", "Cs+ + HSO4-"),
    ("magnesium dihydrogen phosphate", "Mg+2 + 2 H2PO4-"),
    ("dirubidium hydrogen phosphate", "2 Rb+ + HPO4-2"),
    ("zinc(II) bromate", "Zn+2 + 2 BrO3-"),
    ("nickel hypophosphite", "Ni+2 + 2 H2PO2-"),
    ("rubidium dichromate", "2 Rb+ + Cr2O7-2"),
    ("strontium acetate", "Sr+2 + 2 Acetate-"),
]

NOT_SALTS = [
    "AgCNO",  # fulminate, not cyanate
    "HgCl",  # no mercury(I) without its partner
    "FeS2",
    "Fe3O4",
    "PbO2",
    "Li3N",
    "NCl3",
    "ICl",
    "I2",
    "NO",
    "Co",
    "HOH",
    "LiH",
    "CaC2",
    "PbCl4",
    "C6H6",
    "NaC4H7O2",  # butyrate or isobutyrate
    "iron chlorate",  # which iron?
    "copper bromide",
    "zinc(III) bromate",
    "trirubidium hydrogen phosphate",
    "rubidium blargate",
    "hydrogen rubidium",
    "sodium",
    "rubidium azide azide",
    "(((((",
    "Na" * 30,
    "",
]


@pytest.mark.parametrize(("formula", "ions", "water"), FORMULAS)
def test_formula(formula: str, ions: str, water: float) -> None:
    salt = READER.read(formula)
    assert salt is not None
    assert (parse_sum(salt.sum), salt.water) == (parse_sum(ions), water)


@pytest.mark.parametrize(("name", "ions"), NAMED)
def test_name(name: str, ions: str) -> None:
    salt = READER.read(name)
    assert salt is not None
    assert parse_sum(salt.sum) == parse_sum(ions)


@pytest.mark.parametrize("text", NOT_SALTS)
def test_no_salt_is_guessed(text: str) -> None:
    assert READER.read(text) is None


@pytest.mark.parametrize(("formula", "ions", "water"), FORMULAS)
def test_ions_have_the_atoms_of_the_formula(formula: str, ions: str, water: float) -> None:
    atoms: dict[str, float] = {"H": 2 * water, "O": water}
    charge = 0.0
    for token, count in parse_sum(ions).items():
        charge += count * INDEX.species[token].charge
        for symbol, number in INDEX.species[token].atoms.items():
            atoms[symbol] = atoms.get(symbol, 0.0) + count * number
    assert charge == 0
    assert {key: value for key, value in atoms.items() if value} == parse_formula(formula).atoms


def test_listed_salts_read_as_what_the_graph_says_they_give() -> None:
    """Every listed substance whose formula can be cut into ions gives in water the components that the graph states for it."""
    from carboy.chemistry.stock import ChemicalStock
    from carboy.knowledge.equilibria import components_of

    stock = ChemicalStock(INDEX)
    compared, differ = 0, []
    for item in INDEX.substances.values():
        salt = READER.read(item.formula)
        if salt is None or not item.yields or set(item.yields) == {item.id}:
            continue
        compared += 1
        stated = {k: round(v, 6) for k, v in stock.yield_of(item.id).items() if k != "H2O"}
        read = {k: round(v, 6) for k, v in components_of(dict(salt.ions), INDEX).items() if k != "H2O"}
        if stated != read:
            differ.append((item.id, item.formula, stated, read))
    assert compared > 300
    assert not differ


def test_names_take_the_listed_substance_first() -> None:
    assert NAMES.resolve("potassium dichromate").kind == "substance"
    assert NAMES.resolve("K2Cr2O7").kind == "substance"
    assert NAMES.resolve("Co(ClO3)2").kind == "salt"


def test_hydrates_and_forms_of_unlisted_salts() -> None:
    match = NAMES.resolve("cobalt(II) chlorate hexahydrate crystals")
    assert (match.kind, match.extra_water, match.dropped) == ("salt", 6.0, ("crystals",))


def test_an_ambiguous_salt_is_asked_back() -> None:
    assert NAMES.resolve("NaC4H7O2").kind == "unrecognised"
    assert {"sodium butyrate", "sodium isobutyrate"} <= set(NAMES.suggest("NaC4H7O2", 4))


def test_a_metal_whose_charge_is_left_open_is_asked_back() -> None:
    assert NAMES.resolve("iron chlorate").kind == "unrecognised"
    assert NAMES.suggest("iron chlorate", 2) == ("iron(II) chlorate", "iron(III) chlorate")


def test_an_unlisted_salt_is_vetted_and_said_to_be_one() -> None:
    report = Laboratory(INDEX).combine(("5 g of NaHSe", "100 mL of 2 M hydrochloric acid"))
    assert report.verdict == "refuse"
    assert any(one.kind == "toxic-gas" and "H2Se" in one.species for one in report.findings)
    assert any("salt of its ions" in line and "not listed" in line for line in report.assumptions)


def test_amounts_of_an_unlisted_hydrate() -> None:
    report = Laboratory(INDEX).combine(("2.91 g of Co(BrO3)2·6H2O", "100 mL of water"))
    molar = parse_formula("Co(BrO3)2·6H2O").mass
    dissolved = report.steps[-1].dissolved_mol["Br(V)"]
    nominal = dissolved if isinstance(dissolved, float) else dissolved[0]
    assert nominal == pytest.approx(2 * 2.91 / molar, rel=1e-4)
