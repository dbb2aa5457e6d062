"""From Turtle to index: formation from components, dissolution, species of their own, hierarchy, SHACL."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from carboy.knowledge.equilibria import PrintedEquilibrium, components_of, reduce_to_components
from carboy.knowledge.index import load_index
from carboy.knowledge.loading import load_facts, parse_turtle
from carboy.knowledge.validate import check_knowledge, check_shapes
from carboy.model.knowledge import Index, Value
from carboy.text.formulas import imbalance, parse_equation
from tests.knowledge.small_knowledge import BROKEN, small_files


@pytest.fixture
def index(small_kb: Path, cache: Path) -> Index:
    return load_index(small_kb)


def printed(product: str, reaction: str, log10_k: float, enthalpy: float | None = None) -> PrintedEquilibrium:
    def value(magnitude: float) -> Value:
        return Value(magnitude, "1", "a-book", "from memory")

    heat = None if enthalpy is None else value(enthalpy)
    return PrintedEquilibrium(product, "aqueous", parse_equation(reaction), value(log10_k), heat)


def test_gas_is_reduced_through_the_dissolved_molecule(index: Index) -> None:
    gas = next(item for item in index.equilibria if item.product == "H2S(g)")
    assert gas.kind == "gas"
    assert gas.coefficients == {"HS-": 1, "H+": 1}
    assert gas.log10_beta == pytest.approx(7.0 + 1.0)  # 10**8 a(HS-) a(H+) atm
    assert gas.enthalpy_formation is None  # the second link has no enthalpy


def test_solid_written_as_dissolution(index: Index) -> None:
    solid = next(item for item in index.equilibria if item.product == "sphalerite")
    assert solid.kind == "solid"
    assert solid.coefficients == {"Zn+2": 1, "HS-": 1, "H+": -1}  # water cancels: OH- is H2O - H+
    assert solid.log10_beta == pytest.approx(25.5 - 13.997)


def test_enthalpies_add_along_the_links() -> None:
    done, faults = reduce_to_components([printed("B", "A = B", 2.0, 10.0), printed("C", "C = 2 B", -1.0, 5.0)], {"A"})
    assert faults == {}
    assert done["C"].coefficients == {"A": 2}
    assert done["C"].log10_beta == pytest.approx(1.0 + 2 * 2.0)
    assert done["C"].enthalpy_formation == pytest.approx(-5.0 + 2 * 10.0)
    assert done["C"].enthalpy is not None
    assert done["C"].enthalpy.magnitude == 5.0  # as printed


def test_every_formation_is_balanced(index: Index) -> None:
    for item in index.equilibria:
        net = {item.product: -1.0, **item.coefficients}
        assert imbalance(net, lambda token: (index.species[token].atoms, index.species[token].charge)) == {}


def test_complex_with_a_named_ligand(index: Index) -> None:
    species = index.species["ZnEdta-2"]
    assert species.charge == -2
    assert species.atoms == {"Zn": 1, "C": 10, "H": 12, "N": 2, "O": 8}
    assert not species.component


def test_dissolution_has_its_water(index: Index) -> None:
    assert index.substances["sodium-sulfide-nonahydrate"].yields == {"Na+": 2, "HS-": 1, "OH-": 1, "H2O": 8}


def test_components_of_species(index: Index) -> None:
    yields = index.substances["sodium-sulfide-nonahydrate"].yields
    assert components_of(yields, index) == {"Na+": 2, "HS-": 1, "H+": -1, "H2O": 9}
    assert components_of({"H2S": 2.0}, index) == {"HS-": 2, "H+": 2}
    with pytest.raises(KeyError):
        components_of({"no-such-species": 1.0}, index)


def test_a_molecule_is_its_own_component(index: Index) -> None:
    acetone = index.species["acetone"]
    assert acetone.component
    assert acetone.phase == "l"
    assert index.substances["acetone"].yields == {"acetone": 1}
    solubility = index.substances["acetone"].solubility
    assert solubility is not None
    assert solubility.magnitude == math.inf
    assert solubility.unit == "g/L"


def test_ancestors_hold_the_class_itself_first(index: Index) -> None:
    assert index.ancestors["strong-acid"] == ("strong-acid", "acid")


def test_index_does_not_hang_on_the_order_of_reading(small_kb: Path, cache: Path) -> None:
    first = load_index(small_kb)
    for file in cache.iterdir():
        file.unlink()
    assert load_index(small_kb) == first


def test_order_of_blank_nodes_is_steady() -> None:
    first, _ = load_facts(small_files())
    second, _ = load_facts(small_files())
    assert first is not None
    assert second is not None
    assert [node.text(":reaction") for node in first.statements] == [
        node.text(":reaction") for node in second.statements
    ]


def test_sound_knowledge_has_only_notes(small_kb: Path) -> None:
    problems = check_knowledge(small_kb)
    assert [str(problem) for problem in problems if problem.severity == "error"] == []


def test_unused_source_is_a_note(small_kb: Path) -> None:
    (small_kb / "more.ttl").write_text(
        "@prefix src: <urn:carboy:source:> .\n@prefix dct: <http://purl.org/dc/terms/> .\n"
        'src:unread a dct:BibliographicResource ; dct:bibliographicCitation "A book that nobody opened." .\n',
        encoding="utf-8",
    )
    (note,) = [problem for problem in check_knowledge(small_kb) if problem.node == "src:unread"]
    assert note.severity == "note"
    assert note.place == "more.ttl:3"


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("missing-property", "a substance has one formula"),
        ("value-without-source", "a value has one source"),
        ("value-without-unit", "a value has one unit"),
        ("value-without-magnitude", "a value has one magnitude"),
        ("unknown-basis", "basis says how the number was had"),
        ("unknown-state", "state is s, l, g or aq"),
        ("dangling-class", "a class is defined in kb/classes"),
        ("ingredient-order", "a material has ingredients"),
        ("ghs-code", "a GHS statement is an H or EUH code"),
        ("attack-without-reason", "an attack has attacker, rating, reason and source"),
    ],
)
def test_shapes_find_it_too(name: str, message: str) -> None:
    graphs, _ = parse_turtle(small_files(BROKEN / f"{name}.ttl"))
    found = [str(problem) for problem in check_shapes(graphs)]
    assert any(message in problem for problem in found), found


def test_shapes_pass_the_sound_base() -> None:
    graphs, _ = parse_turtle(small_files())
    assert [str(problem) for problem in check_shapes(graphs) if problem.severity == "error"] == []
