"""Namespaces and the closed vocabulary of kb/, which is read from kb/schema.ttl.

This module knows no Turtle parser: :func:`read_vocabulary` takes the triples of schema.ttl as plain text.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

NAMESPACES: dict[str, str] = {
    "": "urn:carboy:term:",
    "sp": "urn:carboy:species:",
    "sub": "urn:carboy:substance:",
    "mat": "urn:carboy:material:",
    "cls": "urn:carboy:class:",
    "src": "urn:carboy:source:",
    "con": "urn:carboy:container:",
    "limit": "urn:carboy:limit:",
    "threshold": "urn:carboy:threshold:",
    "spot": "urn:carboy:spot-test:",
    "el": "urn:carboy:element:",
    "hazard": "urn:carboy:hazard:",
    "treat": "urn:carboy:treatment:",
    "contractor": "urn:carboy:contractor:",
    "reagent": "urn:carboy:reagent:",
    "skos": "http://www.w3.org/2004/02/skos/core#",
    "dct": "http://purl.org/dc/terms/",
    "unit": "http://qudt.org/vocab/unit/",
    "qudt": "http://qudt.org/schema/qudt/",
    "rdf": "http://www.w3.org/1999/02/22-rdf-syntax-ns#",
    "rdfs": "http://www.w3.org/2000/01/rdf-schema#",
    "owl": "http://www.w3.org/2002/07/owl#",
    "xsd": "http://www.w3.org/2001/XMLSchema#",
    "schema": "https://schema.org/",
    "sh": "http://www.w3.org/ns/shacl#",
}
_LONGEST_FIRST = sorted(NAMESPACES.items(), key=lambda item: -len(item[1]))

TYPE = "rdf:type"
STRING = "xsd:string"
DECIMAL = "xsd:decimal"
VALUE = ":Value"
SPECIES = ":Species"
SUBSTANCE = ":Substance"
CONCEPT = "skos:Concept"
SOURCE = "dct:BibliographicResource"
UNIT = "qudt:Unit"
#: Records written in square brackets without a type; the property they stand after tells which.
PART_TYPES = (VALUE, ":Part", ":Companion", ":Attack", ":Point", ":Stage", ":Demand", ":DilutionFirst", ":Quench")


def shorten(iri: str) -> str:
    """``urn:carboy:species:HS-`` -> ``sp:HS-``; an IRI of no known namespace is given back."""
    for prefix, base in _LONGEST_FIRST:
        if iri.startswith(base):
            return f"{prefix}:{iri[len(base) :]}"
    return iri


def expand(name: str) -> str:
    """``sp:HS-`` -> ``urn:carboy:species:HS-``."""
    prefix, _, local = name.partition(":")
    return NAMESPACES[prefix] + local


def local_name(name: str) -> str:
    """``sp:HS-`` -> ``HS-``."""
    return name.partition(":")[2]


@dataclass(frozen=True, slots=True)
class Property:
    """One predicate: where it may stand, what may stand after it. All names are shortened (``:idlh``,
    ``skos:prefLabel``).
    """

    name: str
    domains: frozenset[str]
    ranges: frozenset[str]
    single: bool
    units: frozenset[str] = frozenset()
    allowed: frozenset[str] = frozenset()


@dataclass(frozen=True, slots=True)
class Vocabulary:
    """``classes``: class -> its superclasses and itself; ``requires``: class -> properties; ``units``: ``unit:PPM``
    -> "ppm"; ``prefixes``: class -> prefix of its things.
    """

    properties: dict[str, Property]
    classes: dict[str, frozenset[str]]
    requires: dict[str, frozenset[str]]
    prefixes: dict[str, str]
    units: dict[str, str]


@dataclass(slots=True)
class _Draft:
    """Objects of one subject of schema.ttl by predicate."""

    objects: dict[str, set[str]] = field(default_factory=dict)

    def get(self, predicate: str) -> frozenset[str]:
        return frozenset(self.objects.get(predicate, ()))


def read_vocabulary(triples: Iterable[tuple[str, str, str]]) -> Vocabulary:
    """Build the vocabulary from the triples of schema.ttl; IRIs shortened, literals as their text."""
    drafts: dict[str, _Draft] = {}
    for subject, predicate, value in triples:
        drafts.setdefault(subject, _Draft()).objects.setdefault(predicate, set()).add(value)
    properties = {}
    classes = {}
    requires = {}
    prefixes = {}
    units = {}
    for name, draft in drafts.items():
        types = draft.get(TYPE)
        if "rdfs:Class" in types:
            above = draft.get("rdfs:subClassOf")
            classes[name] = above | {name}
            requires[name] = draft.get(":requires")
            for prefix in draft.get(":namespacePrefix"):
                prefixes[name] = prefix
        elif UNIT in types:
            units[name] = min(draft.get(":symbol"))
        elif "rdf:Property" in types:
            properties[name] = Property(
                name=name,
                domains=draft.get("schema:domainIncludes"),
                ranges=draft.get("rdfs:range"),
                single="owl:FunctionalProperty" in types,
                units=draft.get(":allowedUnit"),
                allowed=draft.get(":allowed"),
            )
    return Vocabulary(properties, classes, requires, prefixes, units)
