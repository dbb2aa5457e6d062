"""The shipped knowledge: no fault, every name and number leads back to its thing, everything is balanced."""

from __future__ import annotations

from collections import Counter

import pytest

from carboy.datafiles import data_dir
from carboy.knowledge.equilibria import components_of
from carboy.knowledge.files import read_files
from carboy.knowledge.index import load_index
from carboy.knowledge.names import Names
from carboy.knowledge.validate import check_knowledge
from carboy.model.knowledge import Index
from carboy.text.formulas import imbalance, is_formula, parse_formula


@pytest.fixture(scope="module")
def index() -> Index:
    return load_index()


def test_no_fault_by_loader_or_shapes() -> None:
    assert [str(problem) for problem in check_knowledge() if problem.severity == "error"] == []


def test_every_turtle_file_is_read() -> None:
    kb = data_dir("kb")
    assert set(read_files()) == {file.relative_to(kb).as_posix() for file in kb.rglob("*.ttl")}
    assert list(kb.rglob("*.py")) == []  # would break an editable install


def test_every_name_and_number_leads_to_its_substance(index: Index) -> None:
    names = Names(index)
    wrong = []
    for item in index.substances.values():
        for text in (item.name, item.name.upper(), *item.synonyms, *item.cas):
            if text.isupper() and is_formula(text):
                continue  # "CO" in capitals is another thing than "Co"
            match = names.resolve(text)
            if (match.kind, match.id) != ("substance", item.id):
                wrong.append((text, item.id, match.kind, match.id))
    assert wrong == []


def test_every_name_leads_to_its_material(index: Index) -> None:
    names = Names(index)
    for item in index.materials.values():
        for text in (item.name, *item.synonyms):
            match = names.resolve(text)
            assert (match.kind, match.id) == ("material", item.id), text


def test_a_formula_never_leads_to_other_atoms(index: Index) -> None:
    names = Names(index)
    found = Counter(names.resolve(item.formula).kind for item in index.substances.values())
    for item in index.substances.values():
        match = names.resolve(item.formula)
        if match.kind == "substance":
            assert index.substances[match.id].atoms == item.atoms, (item.formula, match.id)
    assert found["substance"] > 0.6 * len(index.substances)  # isomers are asked back


def test_formations_and_dissolutions_are_balanced(index: Index) -> None:
    def composition(token: str) -> tuple[dict[str, float], int]:
        return index.species[token].atoms, index.species[token].charge

    for item in index.equilibria:
        assert imbalance({item.product: -1.0, **item.coefficients}, composition) == {}, item.product
        assert all(index.species[token].component for token in item.coefficients), item.product
    for substance in index.substances.values():
        surplus = imbalance(components_of(substance.yields, index), composition)
        for symbol, count in substance.atoms.items():
            surplus[symbol] = surplus.get(symbol, 0.0) - count
        assert all(abs(value) < 1e-6 for value in surplus.values()), (substance.id, surplus)


def test_everything_that_is_named_exists(index: Index) -> None:
    for species in index.species.values():
        assert set(species.classes) <= index.classes.keys(), species.token
    for substance in index.substances.values():
        assert set(substance.companions) <= index.substances.keys()
        assert not substance.ion or substance.ion in index.species
        assert parse_formula(substance.formula).mass > 0
    for material in index.materials.values():
        assert material.balance in index.substances
        assert not material.strength_of or material.strength_of in index.substances
    for gas in index.gases.values():
        assert index.species[gas.species].phase == "g"


def test_metals_have_their_ion(index: Index) -> None:
    zinc = index.substances[Names(index).resolve("Zn").id]
    assert index.species[zinc.ion].charge == 2
    assert index.species[zinc.ion].atoms == zinc.atoms
