"""Strict loading of the Turtle files: each file into a graph of its own, everything against the closed vocabulary.

rdflib takes an unknown predicate, a dangling reference or an ill-typed literal without a word; here each is a Problem.
"""

from __future__ import annotations

import logging
import math
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from difflib import get_close_matches

from rdflib import BNode, Graph, Literal, URIRef
from rdflib.plugins.parsers.notation3 import BadSyntax

from carboy.knowledge.files import SCHEMA, SHAPES
from carboy.knowledge.problems import Problem, in_order
from carboy.knowledge.vocabulary import (
    DECIMAL,
    NAMESPACES,
    PART_TYPES,
    SOURCE,
    SPECIES,
    STRING,
    TYPE,
    UNIT,
    VALUE,
    Property,
    Vocabulary,
    read_vocabulary,
    shorten,
)
from carboy.span import Span

_SUBJECT = re.compile(r"^[ \t]*(?P<name>[A-Za-z]*:(?:\\.|[^\s;,\\])+)(?P<typed>\s+a\s)?", re.MULTILINE)
_TYPES_IN_PARTS = (":Gas",)  # a gas may be declared with the species and again with its limits


@dataclass(frozen=True, slots=True)
class Ref:
    """A reference to a thing, by its shortened IRI: ``cls:acid``."""

    name: str

    @property
    def prefix(self) -> str:
        return self.name.partition(":")[0]

    @property
    def local(self) -> str:
        return self.name.partition(":")[2]


@dataclass(slots=True)
class Node:
    """A thing, a statement without a name, or a part in square brackets, with its checked properties (shortened
    names).
    """

    name: str
    type: str
    file: str
    span: Span | None = None
    values: dict[str, list[Object]] = field(default_factory=dict)

    def text(self, key: str) -> str:
        """The one text of a property, "" if it is not there."""
        return next((item for item in self.values.get(key, ()) if isinstance(item, str)), "")

    def texts(self, key: str) -> tuple[str, ...]:
        return tuple(item for item in self.values.get(key, ()) if isinstance(item, str))

    def number(self, key: str) -> float | None:
        return next((item for item in self.values.get(key, ()) if isinstance(item, float)), None)

    def refs(self, key: str) -> tuple[Ref, ...]:
        return tuple(item for item in self.values.get(key, ()) if isinstance(item, Ref))

    def ref(self, key: str) -> Ref | None:
        return next(iter(self.refs(key)), None)

    def parts(self, key: str) -> tuple[Node, ...]:
        return tuple(item for item in self.values.get(key, ()) if isinstance(item, Node))

    def part(self, key: str) -> Node | None:
        return next(iter(self.parts(key)), None)

    def problem(self, message: str) -> Problem:
        return Problem(self.file, self.name, message, span=self.span)


Object = str | float | Ref | Node


@dataclass(slots=True)
class Facts:
    """What the files say, checked against the vocabulary: things by shortened IRI, nameless statements."""

    vocabulary: Vocabulary
    things: dict[str, Node] = field(default_factory=dict)
    statements: list[Node] = field(default_factory=list)
    sources_used: set[str] = field(default_factory=set)

    def of_type(self, *types: str) -> list[Node]:
        """Things and statements of these types, in the order of files."""
        return [node for node in (*self.things.values(), *self.statements) if node.type in types]


def parse_turtle(files: Mapping[str, bytes]) -> tuple[dict[str, Graph], list[Problem]]:
    """One graph for each file that is well-formed Turtle; a Problem with its place for each that is not."""
    logging.getLogger("rdflib.term").setLevel(logging.ERROR)  # ill-typed literals are reported here, not logged
    graphs = {}
    problems = []
    for name, content in files.items():
        try:
            text = content.decode("utf-8")
        except UnicodeDecodeError as error:
            problems.append(Problem(name, "", f"not UTF-8 text (byte {error.start})"))
            continue
        graph = Graph(bind_namespaces="none")
        try:
            graph.parse(data=text, format="turtle")
        except BadSyntax as error:
            at = max(0, min(getattr(error, "_i", 0), len(text) - 1))
            reason = str(getattr(error, "_why", "not Turtle"))
            problems.append(Problem(name, "", f"no valid Turtle: {reason}", span=Span(text, at, at + 1, name)))
        except Exception as error:
            problems.append(Problem(name, "", f"no valid Turtle: {error}"))
        else:
            graphs[name] = graph
    return graphs, problems


def load_facts(files: Mapping[str, bytes]) -> tuple[Facts | None, list[Problem]]:
    """Everything of the files except schema.ttl and shapes.ttl, checked. Facts is None only if schema.ttl itself
    cannot be read.
    """
    graphs, problems = parse_turtle(files)
    facts, more = check_graphs(graphs, files)
    return facts, in_order([*problems, *more])


def check_graphs(graphs: Mapping[str, Graph], files: Mapping[str, bytes]) -> tuple[Facts | None, list[Problem]]:
    """As :func:`load_facts`, of files that have been parsed."""
    if SCHEMA not in graphs:
        return None, [Problem(SCHEMA, "", "the vocabulary cannot be read")]
    vocabulary = read_vocabulary((shorten(str(s)), shorten(str(p)), shorten(str(o))) for s, p, o in graphs[SCHEMA])
    texts = {name: files[name].decode("utf-8") for name in graphs if name not in (SCHEMA, SHAPES)}
    loader = _Loader(vocabulary, {name: graphs[name] for name in texts}, texts)
    loader.run()
    return loader.facts, loader.problems


class _Loader:
    """One pass over the graphs of all files."""

    def __init__(self, vocabulary: Vocabulary, graphs: Mapping[str, Graph], texts: Mapping[str, str]) -> None:
        self.vocabulary = vocabulary
        self.graphs = graphs
        self.texts = texts
        self.facts = Facts(vocabulary)
        self.problems: list[Problem] = []
        self.places: dict[str, dict[str, Span]] = {}  # file -> subject -> where it is first written
        self.types: dict[str, str] = {}
        self.references: list[tuple[Node, Property, Ref, frozenset[str]]] = []

    def run(self) -> None:
        self._find_places()
        self._find_types()
        for file, graph in self.graphs.items():
            for subject in self._subjects(graph):
                self._read_subject(file, graph, subject)
        for node in self.facts.things.values():
            self._check_complete(node)
        self._check_references()

    def _find_places(self) -> None:
        """Where each subject is written, and subjects that are defined (given a type) twice."""
        defined: dict[str, Span] = {}
        for file, text in self.texts.items():
            places = self.places.setdefault(file, {})
            for match in _SUBJECT.finditer(text):
                name = re.sub(r"\\(.)", r"\1", match["name"])
                span = Span(text, match.start("name"), match.end("name"), file)
                places.setdefault(name, span)
                if not match["typed"]:
                    continue
                first = defined.setdefault(name, span)
                type_name = text[match.end("typed") :].split(maxsplit=1)[0] if match.end("typed") < len(text) else ""
                if first is not span and type_name not in _TYPES_IN_PARTS:
                    self.problems.append(
                        Problem(file, name, f"defined twice; the first is at {first.file}:{first.line}", span=span)
                    )

    def _find_types(self) -> None:
        for file, graph in self.graphs.items():
            for subject, kind in graph.subject_objects(URIRef(NAMESPACES["rdf"] + "type")):
                if not isinstance(subject, URIRef):
                    continue
                name, type_name = shorten(str(subject)), shorten(str(kind))
                known = self.types.setdefault(name, type_name)
                if known != type_name:
                    self._fault(file, name, f"is declared as {known} and as {type_name}")

    def _fault(self, file: str, name: str, message: str) -> None:
        self.problems.append(Problem(file, name, message, span=self.places.get(file, {}).get(name)))

    @staticmethod
    def _subjects(graph: Graph) -> Iterator[URIRef | BNode]:
        """Subjects in a steady order, without the parts of others."""
        inner = {o for o in graph.objects() if isinstance(o, BNode)}
        subjects = [s for s in set(graph.subjects()) if isinstance(s, URIRef | BNode) and s not in inner]
        return iter(sorted(subjects, key=lambda s: (isinstance(s, BNode), _sort_key(graph, s))))

    def _read_subject(self, file: str, graph: Graph, subject: URIRef | BNode) -> None:
        if isinstance(subject, URIRef):
            name = shorten(str(subject))
            type_name = self.types.get(name, "")
            span = self.places.get(file, {}).get(name)
            if not type_name and name.startswith("sp:"):
                type_name = SPECIES  # a dissolved complex; the equilibrium that forms it declares it
        else:
            kinds = [shorten(str(o)) for o in graph.objects(subject, URIRef(NAMESPACES["rdf"] + "type"))]
            type_name = kinds[0] if kinds else ""
            name, span = self._statement_name(file, graph, subject, type_name)
        fresh = Node(name, type_name, file, span)
        if not type_name:
            self.problems.append(fresh.problem("has no type ('a :Substance' or the like)"))
            return
        if type_name not in self.vocabulary.classes or type_name in PART_TYPES:
            near = get_close_matches(type_name, self.vocabulary.classes, 1)
            hint = f"; did you mean {near[0]}?" if near else ""
            self.problems.append(fresh.problem(f"unknown type {type_name}{hint}"))
            return
        prefix = self.vocabulary.prefixes.get(type_name)
        if isinstance(subject, URIRef):
            if prefix is None:
                self.problems.append(fresh.problem(f"a {type_name} is written without a name: '[] a {type_name}'"))
            elif prefix != name.partition(":")[0]:
                self.problems.append(fresh.problem(f"a {type_name} has the prefix {prefix}:"))
            node = self.facts.things.setdefault(name, fresh)
        elif prefix is not None:
            self.problems.append(fresh.problem(f"a {type_name} needs a name ({prefix}:...)"))
            return
        else:
            node = fresh
            self.facts.statements.append(node)
        self._read_properties(file, graph, subject, node)
        if isinstance(subject, BNode):
            self._check_complete(node)

    def _statement_name(self, file: str, graph: Graph, subject: BNode, type_name: str) -> tuple[str, Span | None]:
        """A name to show for a statement without one, and its place by its most telling text."""
        text = self.texts[file]
        for key in (":reaction", ":subject"):
            for value in graph.objects(subject, URIRef(NAMESPACES[""] + key[1:])):
                at = text.find(f'"{value}"') if isinstance(value, Literal) else -1
                span = Span(text, at, at + len(str(value)) + 2, file) if at >= 0 else None
                return f"{type_name.strip(':')} '{shorten(str(value))}'", span
        return type_name.strip(":"), None

    def _read_properties(self, file: str, graph: Graph, subject: URIRef | BNode, node: Node) -> None:
        """Check and add all properties of ``subject`` (as written in ``file``) to ``node``."""
        here = Node(node.name, node.type, file, self.places.get(file, {}).get(node.name, node.span))
        classes = self.vocabulary.classes[node.type]
        seen: dict[str, list[Object]] = {}
        for predicate, value in graph.predicate_objects(subject):
            key = shorten(str(predicate))
            if key == TYPE:
                continue
            form = self.vocabulary.properties.get(key)
            if form is None:
                near = get_close_matches(key, self.vocabulary.properties, 1)
                hint = f"; did you mean {near[0]}?" if near else ""
                self.problems.append(here.problem(f"unknown predicate {key}{hint}"))
                continue
            if not form.domains & classes:
                self.problems.append(here.problem(f"{key} does not belong on a {node.type}"))
                continue
            item = self._read_object(file, graph, here, form, value)
            if item is not None:
                seen.setdefault(key, []).append(item)
        for key, items in seen.items():
            items.sort(key=_object_key)
            held = node.values.setdefault(key, [])
            held += [item for item in items if item not in held]
            if self.vocabulary.properties[key].single and len(held) > 1:
                other = f" (also in {node.file})" if node.file != file else ""
                self.problems.append(here.problem(f"{key} is given twice{other}"))
                del held[1:]

    def _read_object(self, file: str, graph: Graph, owner: Node, form: Property, value: object) -> Object | None:
        """One object, checked against the range of its property; None (and a Problem) if it does not fit."""
        problem: str
        if isinstance(value, Literal):
            return self._read_literal(owner, form, value)
        if isinstance(value, BNode):
            if form.ranges & set(PART_TYPES):
                return self._read_part(file, graph, owner, form, value)
            problem = f"{form.name} takes no square brackets"
        else:
            ref = Ref(shorten(str(value)))
            ranges = form.ranges - {STRING, DECIMAL} - set(PART_TYPES)
            if ranges:
                self.references.append((owner, form, ref, ranges))
                if SOURCE in ranges:
                    self.facts.sources_used.add(ref.name)
                return ref
            problem = f"{form.name} takes no name, but {ref.name} is written"
        self.problems.append(owner.problem(problem))
        return None

    def _read_literal(self, owner: Node, form: Property, value: Literal) -> str | float | None:
        if value.ill_typed:
            self.problems.append(owner.problem(f"{form.name}: '{value}' is no {shorten(str(value.datatype))}"))
            return None
        numeric = (isinstance(value.value, int) and not isinstance(value.value, bool)) or (
            value.datatype is not None
            and shorten(str(value.datatype)) in (DECIMAL, "xsd:double", "xsd:float", "xsd:integer")
        )
        if numeric and DECIMAL in form.ranges:
            number = float(value)
            if math.isfinite(number):
                return number
            self.problems.append(owner.problem(f"{form.name}: {value} is not finite"))
            return None
        if not numeric and STRING in form.ranges:
            text = str(value)
            if form.allowed and text not in form.allowed:
                words = ", ".join(sorted(form.allowed))
                self.problems.append(owner.problem(f"{form.name}: '{text}' is not among: {words}"))
                return None
            if not text.strip():
                self.problems.append(owner.problem(f"{form.name} is empty"))
                return None
            return text
        need = "a number" if DECIMAL in form.ranges else "a text" if STRING in form.ranges else ""
        need = need or ("a value [ :magnitude ... ]" if VALUE in form.ranges else "a name")
        self.problems.append(owner.problem(f"{form.name} takes {need}, not '{value}'"))
        return None

    def _read_part(self, file: str, graph: Graph, owner: Node, form: Property, subject: BNode) -> Node:
        kind = next(kind for kind in PART_TYPES if kind in form.ranges)
        part = Node(f"{owner.name} {form.name}", kind, file, owner.span)
        self._read_properties(file, graph, subject, part)
        self._check_complete(part, owner=owner, form=form)
        return part

    def _check_complete(self, node: Node, *, owner: Node | None = None, form: Property | None = None) -> None:
        """What must be there is there; a value is whole and has a unit that its property takes."""
        missing = self.vocabulary.requires.get(node.type, frozenset()) - node.values.keys()
        if owner is not None and owner.type == ":Threshold":
            missing -= {":basis"}  # a threshold is a decision; its reason is its basis
        if missing:
            self.problems.append(node.problem(f"lacks {', '.join(sorted(missing))}"))
        if node.type in (VALUE, ":Attack") and len(node.refs(":source")) > 1:
            self.problems.append(node.problem("has more than one :source"))
        if node.type == VALUE and form is not None:
            self._check_value(node, form)

    def _check_value(self, node: Node, form: Property) -> None:
        magnitude, low, high = node.number(":magnitude"), node.number(":low"), node.number(":high")
        miscible = form.name == ":solubility" and node.text(":note").startswith("miscible")
        if ":magnitude" not in node.values and not miscible:
            self.problems.append(node.problem("lacks :magnitude"))
        if form.units:
            for unit in node.refs(":unit"):
                if unit.name not in form.units:
                    need = " or ".join(sorted(form.units))
                    self.problems.append(node.problem(f"has the unit {unit.name}; it must be {need}"))
        ends = [end for end in (low, magnitude, high) if end is not None]
        if ends != sorted(ends):
            self.problems.append(node.problem("is not between its :low and :high"))

    def _check_references(self) -> None:
        """Every name that is referred to exists and is of a type that the property takes."""
        formed = {ref.name for node in self.facts.statements for ref in node.refs(":forms")}
        for name, node in self.facts.things.items():
            if node.type == SPECIES and name not in formed:
                self.problems.append(
                    node.problem("is neither declared (:Component, :Solid, :Gas) nor formed by an equilibrium")
                )
        missing: dict[
            tuple[str, str], list[Node]
        ] = {}  # (message, name) -> who refers to it; one Problem for all of them
        for owner, form, ref, ranges in self.references:
            if UNIT in ranges:
                if ref.name not in self.vocabulary.units:
                    missing.setdefault((f"unknown unit {ref.name}", ref.name), []).append(owner)
                continue
            if SPECIES in ranges and ref.name in formed:
                continue
            type_name = self.types.get(ref.name)
            if type_name is None:
                missing.setdefault((f"{form.name} refers to {ref.name}, which is not defined", ref.name), []).append(
                    owner
                )
            elif not self.vocabulary.classes.get(type_name, frozenset()) & ranges:
                self.problems.append(
                    owner.problem(f"{form.name} takes {' or '.join(sorted(ranges))}, but {ref.name} is a {type_name}")
                )
        for (message, name), owners in missing.items():
            prefix = name.partition(":")[0] + ":"
            candidates = (
                self.vocabulary.units if prefix == "unit:" else [key for key in self.types if key.startswith(prefix)]
            )
            near = get_close_matches(name, candidates, 1, cutoff=0.75)
            hint = f"; did you mean {near[0]}?" if near else ""
            others = f" (and in {len(owners) - 1} more places)" if len(owners) > 1 else ""
            self.problems.append(owners[0].problem(message + others + hint))


def _sort_key(graph: Graph, subject: URIRef | BNode) -> str:
    """For blank nodes their texts, so that the order does not hang on random labels."""
    if isinstance(subject, URIRef):
        return str(subject)
    return " ".join(sorted(f"{p} {o}" for p, o in graph.predicate_objects(subject) if not isinstance(o, BNode)))


def _object_key(item: Object) -> tuple[int, float, str]:
    """A steady order of the objects of one property."""
    if isinstance(item, float):
        return 0, item, ""
    if isinstance(item, str):
        return 1, 0.0, item
    if isinstance(item, Ref):
        return 2, 0.0, item.name
    return 3, 0.0, " ".join(f"{key} {_flat(values)}" for key, values in sorted(item.values.items()))


def _flat(values: list[Object]) -> str:
    return " ".join(
        f"{item:020.9f}" if isinstance(item, float) else getattr(item, "name", str(item)) for item in values
    )
