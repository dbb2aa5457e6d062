"""The full check of a knowledge folder: strict loading, compilation, SHACL shapes, structures, sources that nothing uses."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from rdflib import RDF, Graph, URIRef

from carboy.knowledge.compile import compile_index
from carboy.knowledge.files import SCHEMA, SHAPES, read_files
from carboy.knowledge.loading import Facts, check_graphs, parse_turtle
from carboy.knowledge.problems import Problem, in_order
from carboy.knowledge.vocabulary import SOURCE, expand, shorten
from carboy.model.knowledge import Index


def check_knowledge(path: Path | None = None) -> list[Problem]:
    """Everything that is wrong with the folder ``path`` (None: the shipped kb/), errors first, then notes.

    Raises KnowledgeError or DataFilesMissing only if there is no such folder.
    """
    files = read_files(path)
    graphs, problems = parse_turtle(files)
    facts, more = check_graphs(graphs, files)
    problems += more
    if facts is not None:
        index, faults = compile_index(facts)
        problems += [*faults, *check_shapes(graphs), *_unused_sources(facts)]
        if not faults:
            problems += _check_structures(facts, index)
    return in_order(problems)


def _check_structures(facts: Facts, index: Index) -> list[Problem]:
    """Structures against what is stated beside them: the formula, and the classes that a structure must show."""
    drawn = [item for item in index.substances.values() if item.smiles]
    if not drawn:
        return []
    from carboy.knowledge.structures import ClassPatterns, read_structure

    patterns = ClassPatterns(index.classes)
    problems = []
    for item in drawn:
        node = facts.things[f"sub:{item.id}"]
        structure = read_structure(item.smiles)
        if structure.charge:
            problems.append(node.problem(f":smiles {item.smiles} has a charge of {structure.charge:+d}"))
        if structure.atoms != item.atoms:
            problems.append(
                node.problem(f":smiles {item.smiles} is {structure.formula}, but :formula is {item.formula}")
            )
        stated = tuple(key for key in item.classes if key not in item.derived)
        for key in patterns.unfounded(stated, patterns.classes_of(item.smiles)):
            problems.append(node.problem(f"is stated to be {key}, which its structure {item.smiles} does not show"))
    return problems


def check_shapes(graphs: Mapping[str, Graph]) -> list[Problem]:
    """What the SHACL shapes of shapes.ttl find in the union of all files; a folder without shapes.ttl has none."""
    if SHAPES not in graphs:
        return []
    from pyshacl import validate

    whole = Graph(bind_namespaces="none")
    homes: dict[object, str] = {}
    for name, part in graphs.items():
        if name == SHAPES:
            continue
        for triple in part:
            whole.add(triple)
            if name != SCHEMA:
                homes.setdefault(triple[0], name)
    # only classes and their hierarchy are wanted of the schema; RDFS inference is not
    _, report, _ = validate(whole, shacl_graph=graphs[SHAPES], inference="none", advanced=False)
    shacl = "http://www.w3.org/ns/shacl#"
    found = []
    for result in report.subjects(RDF.type, URIRef(shacl + "ValidationResult")):
        focus = report.value(result, URIRef(shacl + "focusNode"))
        message = report.value(result, URIRef(shacl + "resultMessage"))
        along = report.value(result, URIRef(shacl + "resultPath"))
        severity = str(report.value(result, URIRef(shacl + "resultSeverity")) or "")
        about = shorten(str(focus)) if isinstance(focus, URIRef) else ""
        if not about:  # a part or a statement without a name: show what it hangs on
            owner = next((s for s in whole.subjects(None, focus) if isinstance(s, URIRef)), None)
            about = (
                shorten(str(owner)) if owner is not None else str(whole.value(focus, URIRef(expand(":reaction"))) or "")
            )
        text = f"{shorten(str(along))}: {message}" if isinstance(along, URIRef) else str(message)
        found.append(
            Problem(homes.get(focus, ""), about, text, "note" if severity.endswith(("Warning", "Info")) else "error")
        )
    return sorted(found, key=lambda item: (item.file, item.node, item.message))


def _unused_sources(facts: Facts) -> list[Problem]:
    """Sources that no value cites."""
    return [
        Problem(node.file, node.name, "no value cites this source", "note", node.span)
        for node in facts.of_type(SOURCE)
        if node.name not in facts.sources_used
    ]
