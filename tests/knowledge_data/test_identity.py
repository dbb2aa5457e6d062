"""Who a substance is: molar masses, CAS numbers and formulas of the whole graph against two general-purpose libraries."""

from __future__ import annotations

import pytest
from chemicals import identifiers
from molmass import Formula

from carboy.knowledge.cas import check_digit_fits
from carboy.knowledge.index import load_index
from carboy.text.formulas import hill_formula, molar_mass, parse_formula

INDEX = load_index()

# The library draws many salts and hydrates as one acid molecule with one metal atom and one water, or leaves hydrogens out; its
# formula is then not that of the CAS number. Each of these was looked at; the graph's formula is the right one.
WATER_LEFT_OUT = """molybdic-acid-monohydrate tin-ii-chloride-dihydrate zirconium-oxychloride-octahydrate barium-tetrasulfide
 magnesium-chloride-hexahydrate cobalt-ii-chloride-hexahydrate manganese-ii-chloride-tetrahydrate cadmium-chloride-hemipentahydrate
 sodium-dithionate-dihydrate cadmium-sulfate-octahydrate calcium-sulfate-hemihydrate"""
DRAWN_AS_ITS_ACID = """aluminium-nitrate-nonahydrate aluminium-sulfate-octadecahydrate beryllium-sulfate-tetrahydrate uranyl-acetate-anhydrous
 uranyl-acetate-dihydrate uranyl-nitrate-anhydrous uranyl-nitrate-hexahydrate ammonium-heptamolybdate-tetrahydrate
 ammonium-nickel-ii-sulfate-hexahydrate ammonium-tris-oxalato-ferrate-iii-trihydrate calcium-cyanamide
 calcium-dihydrogenphosphate-monohydrate magnesium-carbonate-hydroxide-pentahydrate copper-ii-nitrate-trihydrate zinc-nitrate-hexahydrate
 manganese-ii-sulfate-anhydrous manganese-ii-sulfate-monohydrate cadmium-nitrate-tetrahydrate lead-ii-acetate-basic
 mercury-i-nitrate mercury-i-nitrate-dihydrate mercury-ii-thiocyanate potassium-aluminium-sulfate-dodecahydrate hydroxylamine-sulfate
 silver-phosphate disodium-hydrogenphosphate-heptahydrate sodium-pyrosulfate sodium-stannate-trihydrate sodium-sulfide-nonahydrate
 lead-ii-hydroxide"""
HYDROGENS_MISCOUNTED = """hypophosphorous-acid tributyltin-hydride lithium-nitride fluorescein-sodium cupferron trisodium-trimercaptotriazine
 merbromin potassium-borohydride sodium-cyanoborohydride sodium-triacetoxyborohydride silver-sulfide sodium-hypophosphite-anhydrous
 sodium-hypophosphite-monohydrate borane-dimethyl-sulfide-complex borane-tetrahydrofuran-complex diisobutylaluminium-hydride
 iron-ii-iii-oxide"""
OTHER_FORMULA_UNIT = """phosphorus-pentoxide arsenic-iii-sulfide phosphorus-pentasulfide sodium-percarbonate bentonite calcium-silicate
 sodium-orthovanadate nitrocellulose polysorbate-20 triton-x-100"""
OTHER_SUBSTANCE = "white-spirit"  # a mixture; the library has another compound under its number
EXCEPTIONS = frozenset(
    " ".join((WATER_LEFT_OUT, DRAWN_AS_ITS_ACID, HYDROGENS_MISCOUNTED, OTHER_FORMULA_UNIT, OTHER_SUBSTANCE)).split()
)


def test_molar_masses_against_molmass() -> None:
    compared = 0
    for item in INDEX.substances.values():
        whole = {symbol: 2 * count for symbol, count in item.atoms.items()}  # halves of water in hemihydrates
        if any(count != int(count) for count in whole.values()):
            continue
        compared += 1
        mass = Formula(hill_formula({symbol: int(count) for symbol, count in whole.items()})).mass / 2
        assert molar_mass(item.atoms) == pytest.approx(mass, rel=3e-4), item.id
    assert compared > 1400


def test_check_digits_of_cas_numbers() -> None:
    numbers = [number for item in INDEX.substances.values() for number in item.cas]
    assert len(numbers) > 1300
    assert not [number for number in numbers if not check_digit_fits(number)]


def test_no_cas_number_stands_on_two_substances() -> None:
    owners: dict[str, list[str]] = {}
    for item in INDEX.substances.values():
        for number in item.cas:
            owners.setdefault(number, []).append(item.id)
    assert not {number: ids for number, ids in owners.items() if len(ids) > 1}


def test_formula_belongs_to_the_cas_number() -> None:
    """Against the table of the ``chemicals`` package, for every CAS number that it has."""
    compared, differ = 0, []
    for item in INDEX.substances.values():
        for number in item.cas:
            try:
                known = identifiers.search_chemical(number)
            except ValueError:
                continue
            if known.CASs != number:
                continue
            compared += 1
            if item.id not in EXCEPTIONS and parse_formula(known.formula).atoms != item.atoms:
                differ.append((item.id, number, item.formula, known.formula))
    assert compared > 1200
    assert not differ


def test_exceptions_are_of_the_graph() -> None:
    assert not EXCEPTIONS - INDEX.substances.keys()


def test_sizes() -> None:
    """What a real waste shelf needs; the numbers are read from the index."""
    assert len(INDEX.substances) >= 700
    assert len(INDEX.materials) >= 110
    assert len(INDEX.gases) >= 70
    assert len(INDEX.containers) >= 25
    assert sum(bool(item.cas) for item in INDEX.substances.values()) >= 700
    assert sum(bool(item.smiles) for item in INDEX.substances.values()) >= 600


def test_organic_substances_have_structures() -> None:
    """Compounds of carbon with hydrogen, but for polymers, mixtures, coordination compounds and salts whose ions carry the classes."""
    bare = [
        item.id
        for item in INDEX.substances.values()
        if "organic" in {up for key in item.classes for up in INDEX.ancestors[key]}
        and item.atoms.get("H")
        and not item.smiles
    ]
    drawn = [
        item.id
        for item in INDEX.substances.values()
        if item.smiles and "organic" in {up for key in item.classes for up in INDEX.ancestors[key]}
    ]
    assert len(drawn) > 10 * len(bare), bare
