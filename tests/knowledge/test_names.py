"""Names on labels: what is resolved, what only suggested, what refused."""

from __future__ import annotations

import pytest

from carboy.errors import InputError
from carboy.knowledge.compile import compile_index
from carboy.knowledge.loading import load_facts
from carboy.knowledge.names import Names
from tests.knowledge.small_knowledge import small_files

# Substances for tests only: invented entries with real names and formulas.
MORE = """
@prefix : <urn:carboy:term:> .
@prefix sp: <urn:carboy:species:> .
@prefix sub: <urn:carboy:substance:> .
@prefix mat: <urn:carboy:material:> .
@prefix con: <urn:carboy:container:> .
@prefix cls: <urn:carboy:class:> .
@prefix src: <urn:carboy:source:> .
@prefix skos: <http://www.w3.org/2004/02/skos/core#> .
cls:methyl-ketone a skos:Concept ; skos:prefLabel "methyl ketone" .
cls:sulfide a skos:Concept ; skos:prefLabel "sulfide" .
sp:HS- :class cls:sulfide .
sp:CrO4-2 a :Component ; skos:prefLabel "chromate" ; :reportKey "Cr(VI)" .
sp:Cr\\+3 a :Component ; skos:prefLabel "chromium(III) ion" ; :reportKey "Cr(III)" .
sub:copper-ii-sulfate a :Substance ; skos:prefLabel "copper(II) sulfate" ; skos:altLabel "cupric sulfate" ;
  :formula "CuSO4" ; :state "s" .
sub:copper-ii-sulfate-pentahydrate a :Substance ; skos:prefLabel "copper(II) sulfate pentahydrate" ;
  skos:altLabel "copper sulfate" , "blue vitriol" ;
  :formula "CuSO4·5H2O" ; :state "s" .
sub:aluminium a :Substance ; skos:prefLabel "aluminium" ; :formula "Al" ; :state "s" .
sub:aluminium-chloride-hexahydrate a :Substance ; skos:prefLabel "aluminium chloride hexahydrate" ;
  :formula "AlCl3·6H2O" ; :state "s" .
sub:cobalt a :Substance ; skos:prefLabel "cobalt" ; :formula "Co" ; :state "s" .
sub:zinc a :Substance ; skos:prefLabel "zinc" ; :formula "Zn" ; :cas "7440-66-6" ; :state "s" .
sub:zinc-powder a :Substance ; skos:prefLabel "zinc powder" ; :formula "Zn" ; :state "s" .
sub:sodium-sulfite a :Substance ; skos:prefLabel "sodium sulfite" ; :formula "Na2SO3" ; :state "s" .
sub:sodium-sulfide a :Substance ; skos:prefLabel "sodium sulfide" ; :formula "Na2S" ; :cas "1313-82-2" ; :state "s" .
sub:silver-cyanate a :Substance ; skos:prefLabel "silver cyanate" ; :formula "AgOCN" ; :state "s" .
sub:propanal a :Substance ; skos:prefLabel "propanal" ; :formula "C3H6O" ; :state "l" .
sub:sodium-nitrate a :Substance ; skos:prefLabel "sodium nitrate" ; :formula "NaNO3" ; :state "s" .
mat:household-bleach a :Material ; skos:prefLabel "household bleach" ; skos:altLabel "bleach" ; :state "l" ;
  :source src:a-book ;
  :part [ :substance sub:sodium-nitrate ; :low 1 ; :typical 2 ; :high 3 ] .
con:hdpe a :Container ; skos:prefLabel "HDPE" ; skos:altLabel "high-density polyethylene" .
con:aluminium a :Container ; skos:prefLabel "aluminium" .
"""


@pytest.fixture(scope="module")
def names() -> Names:
    facts, problems = load_facts({**small_files(), "more.ttl": MORE.encode()})
    assert facts is not None
    index, more = compile_index(facts)
    assert [str(problem) for problem in (*problems, *more)] == []
    return Names(index)


@pytest.mark.parametrize(
    ("text", "identifier"),
    [
        ("copper(II) sulfate", "copper-ii-sulfate"),
        ("Copper (ii) Sulphate", "copper-ii-sulfate"),
        ("copper II sulfate", "copper-ii-sulfate"),
        ("cupric sulfate", "copper-ii-sulfate"),
        ("copper sulfate", "copper-ii-sulfate-pentahydrate"),
        ("aluminum", "aluminium"),
        ("CuSO4", "copper-ii-sulfate"),
        ("CuSO4.5H2O", "copper-ii-sulfate-pentahydrate"),
        ("CuSO4 * 5 H2O", "copper-ii-sulfate-pentahydrate"),
        ("cuso4", "copper-ii-sulfate"),
        ("NaNO3", "sodium-nitrate"),
        ("NANO3", "sodium-nitrate"),
        ("SO3Na2", "sodium-sulfite"),
        ("Co", "cobalt"),
        ("Zn", "zinc"),
        ("zinc powder", "zinc-powder"),
        ("1313-84-4", "sodium-sulfide-nonahydrate"),
        ("CAS 1313-82-2", "sodium-sulfide"),
        ("CAS No. 1313–82–2", "sodium-sulfide"),
        ("sodium sulphide", "sodium-sulfide"),
        ("sodium nitrate solution", "sodium-nitrate"),
        ("aqueous sodium nitrate", "sodium-nitrate"),
        ("solution of sodium nitrate in water", "sodium-nitrate"),
        ("nitrate, sodium", "sodium-nitrate"),
        ("zinc granules", "zinc"),
        ("sodium nitrate crystals", "sodium-nitrate"),
        ("sodium nitrates", "sodium-nitrate"),
        ("anhydrous copper sulfate", "copper-ii-sulfate"),
    ],
)
def test_resolved(names: Names, text: str, identifier: str) -> None:
    match = names.resolve(text)
    assert (match.kind, match.id, match.extra_water) == ("substance", identifier, 0.0)
    assert match.text == text


@pytest.mark.parametrize(
    ("text", "identifier", "water"),
    [
        ("copper(II) sulfate trihydrate", "copper-ii-sulfate", 3.0),
        ("copper(II) sulfate pentahydrate", "copper-ii-sulfate-pentahydrate", 0.0),
        ("copper sulfate monohydrate", "copper-ii-sulfate", 1.0),
        ("copper sulfate heptahydrate", "copper-ii-sulfate-pentahydrate", 2.0),
        ("CuSO4·7H2O", "copper-ii-sulfate", 7.0),
        ("copper(II) sulfate · 7 H2O", "copper-ii-sulfate", 7.0),
        ("sodium sulfide hemihydrate", "sodium-sulfide", 0.5),
        ("sodium nitrate dodecahydrate solution", "sodium-nitrate", 12.0),
    ],
)
def test_hydrates(names: Names, text: str, identifier: str, water: float) -> None:
    match = names.resolve(text)
    assert (match.kind, match.id, match.extra_water) == ("substance", identifier, water)


def test_hydrate_without_a_number_is_noted(names: Names) -> None:
    match = names.resolve("sodium sulfide hydrate")
    assert match.id == "sodium-sulfide"
    assert "not stated" in match.notes[0]


def test_words_that_were_passed_over_are_told(names: Names) -> None:
    assert names.resolve("sodium nitrate solution").dropped == ("solution",)
    assert names.resolve("sodium nitrate").dropped == ()


def test_materials(names: Names) -> None:
    for text in ("household bleach", "Bleach", "bleaches"):
        match = names.resolve(text)
        assert (match.kind, match.id) == ("material", "household-bleach")


@pytest.mark.parametrize(
    ("text", "token"),
    [("HS-", "HS-"), ("Cr3+", "Cr+3"), ("CrO4^2-", "CrO4-2"), ("CrO₄²⁻", "CrO4-2"), ("CrO42-", "CrO4-2")],
)
def test_species(names: Names, text: str, token: str) -> None:
    match = names.resolve(text)
    assert (match.kind, match.id) == ("species", token)


@pytest.mark.parametrize(
    "text",
    [
        "CO",  # carbon monoxide is not known here, and is not cobalt
        "co",
        "AgCNO",  # not the cyanate: another order of atoms is another thing where there is carbon
        "CH3CH2CHO",  # an isomer of what is known
        "C3H6O",  # fits two
        "sodium sulfit",
        "sodium nitride",
        "aluminium chloride",  # only the hexahydrate is known, and the other reacts with water
        "anhydrous aluminium chloride",
        "7732-18-5",
        "frobnium",
        "",
    ],
)
def test_not_taken_for_anything(names: Names, text: str) -> None:
    match = names.resolve(text)
    assert match.kind == "unrecognised"
    assert not match.recognised


def test_wrong_check_digit_is_refused(names: Names) -> None:
    with pytest.raises(InputError, match="check digit") as caught:
        names.resolve("CAS 1313-82-3")
    assert caught.value.span is not None
    assert caught.value.span.column == 5


def test_suggestions(names: Names) -> None:
    assert "sodium sulfite" in names.suggest("sodium sulfit")
    assert "sodium nitrate" in names.suggest("sodium nitride")
    assert set(names.suggest("C3H6O")) >= {"acetone", "propanal"}
    assert names.suggest("CO")[0] == "cobalt"
    assert len(names.suggest("sodium", 2)) <= 2
    assert names.suggest("qqqqqqqqqqqq") == ()


def test_containers_classes_gases(names: Names) -> None:
    assert names.container("High density polyethylene") == "hdpe"
    assert names.container("aluminum") == "aluminium"  # also a substance: kinds do not clash
    assert names.container("granite") is None
    assert names.chemical_class("methyl ketones") == "methyl-ketone"
    assert names.chemical_class("strong-acid") == "strong-acid"
    assert names.chemical_class("ghost") is None
    assert names.gas("hydrogen sulfide") == names.gas("H2S") == names.gas("H2S(g)") == "H2S(g)"
    assert names.gas("acetone") is None


@pytest.mark.parametrize(
    ("text", "keys"),
    [
        ("chromium", ("Cr(III)", "Cr(VI)")),
        ("Cr", ("Cr(III)", "Cr(VI)")),
        ("Cr(VI)", ("Cr(VI)",)),
        ("chromium(VI)", ("Cr(VI)",)),
        ("chromate", ("Cr(VI)",)),
        ("zinc", ("Zn",)),
        ("sulfide", ("S(-II)",)),
        ("acetone", ("acetone",)),
        ("frobnium", ()),
    ],
)
def test_report_keys(names: Names, text: str, keys: tuple[str, ...]) -> None:
    assert names.report_keys(text) == keys
