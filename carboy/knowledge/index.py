"""The compiled index: loaded from the cache if the files are unchanged, else compiled from Turtle."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from carboy.cache import is_cached, read_cached, write_cached
from carboy.knowledge.files import digest, read_files
from carboy.knowledge.problems import KnowledgeProblems
from carboy.model.knowledge import Index

if TYPE_CHECKING:
    from rdflib import Graph

_SORT = "index"  # under which it is kept in the cache


def load_index(path: Path | None = None) -> Index:
    """The index of the knowledge folder ``path`` (None: the shipped kb/).

    Raises KnowledgeProblems with every error of the files, KnowledgeError or DataFilesMissing if there are no files.
    """
    files = read_files(path)
    key = digest(files)
    index = read_cached(_SORT, key, Index)
    if index is None:
        index = _compile(files)
        write_cached(_SORT, key, index)
    return index


def is_compiled(path: Path | None = None) -> bool:
    """Whether :func:`load_index` will find the folder in the cache, or must compile it, which takes some seconds."""
    return is_cached(_SORT, digest(read_files(path)))


def graph(path: Path | None = None) -> Graph:
    """The whole rdflib graph (facts and vocabulary), for queries and export. Raises KnowledgeProblems if a file is no
    Turtle.
    """
    from rdflib import Graph

    from carboy.knowledge.loading import parse_turtle
    from carboy.knowledge.vocabulary import NAMESPACES

    graphs, problems = parse_turtle(read_files(path))
    if problems:
        raise KnowledgeProblems(problems)
    whole = Graph(bind_namespaces="none")
    for prefix, base in NAMESPACES.items():
        whole.bind(prefix, base)
    for part in graphs.values():
        for triple in part:
            whole.add(triple)
    return whole


def _compile(files: dict[str, bytes]) -> Index:
    from carboy.knowledge.compile import compile_index
    from carboy.knowledge.loading import load_facts

    facts, problems = load_facts(files)
    if facts is None:
        raise KnowledgeProblems(problems)
    index, more = compile_index(facts)
    if problems or more:
        raise KnowledgeProblems([*problems, *more])
    return index
