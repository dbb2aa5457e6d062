"""The compiled index: loaded from the cache if the files are unchanged, else compiled from Turtle.

The cache is MessagePack of plain data (nothing of it can run), named by the digest of the files and led by a digest
of itself. It may be deleted at any time; what cannot be read or written is passed over.
"""

from __future__ import annotations

import gc
import hashlib
import os
import tempfile
from pathlib import Path
from typing import TYPE_CHECKING

import msgspec

from carboy.knowledge.files import digest, read_files
from carboy.knowledge.problems import KnowledgeProblems
from carboy.model.knowledge import Index

if TYPE_CHECKING:
    from rdflib import Graph

_CHECK_SIZE = 16  # bytes of the leading digest
_KEPT = 4  # compiled indexes kept in the folder


def cache_folder() -> Path:
    """Where compiled indexes are kept: ``CARBOY_CACHE`` if set, else the user's cache folder."""
    chosen = os.environ.get("CARBOY_CACHE")
    if chosen:
        return Path(chosen)
    from platformdirs import user_cache_dir  # noqa: PLC0415 - 30 ms

    return Path(user_cache_dir("carboy", appauthor=False))


def load_index(path: Path | None = None) -> Index:
    """The index of the knowledge folder ``path`` (None: the shipped kb/).

    Raises KnowledgeProblems with every error of the files, KnowledgeError or DataFilesMissing if there are no files.
    """
    files = read_files(path)
    name = f"index-{digest(files)}.msgpack"
    folder = cache_folder()
    index = _read(folder / name)
    if index is None:
        index = _compile(files)
        _write(folder, name, index)
    return index


def graph(path: Path | None = None) -> Graph:
    """The whole rdflib graph (facts and vocabulary), for queries and export. Raises KnowledgeProblems if a file is no
    Turtle.
    """
    from rdflib import Graph  # noqa: PLC0415 - 0.15 s, not for a check that finds the cache

    from carboy.knowledge.loading import parse_turtle  # noqa: PLC0415 - brings rdflib
    from carboy.knowledge.vocabulary import NAMESPACES  # noqa: PLC0415

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
    from carboy.knowledge.compile import compile_index  # noqa: PLC0415 - brings rdflib
    from carboy.knowledge.loading import load_facts  # noqa: PLC0415

    facts, problems = load_facts(files)
    if facts is None:
        raise KnowledgeProblems(problems)
    index, more = compile_index(facts)
    if problems or more:
        raise KnowledgeProblems([*problems, *more])
    return index


def _read(file: Path) -> Index | None:
    """The cached index, or None if there is none that is whole."""
    try:
        content = file.read_bytes()
    except OSError:
        return None
    check, body = content[:_CHECK_SIZE], content[_CHECK_SIZE:]
    if hashlib.blake2b(body, digest_size=_CHECK_SIZE).digest() != check:
        return None
    collecting = gc.isenabled()
    gc.disable()  # ten thousand fresh records, none of them garbage
    try:
        return msgspec.msgpack.decode(body, type=Index)
    except msgspec.MsgspecError:
        return None
    finally:
        if collecting:
            gc.enable()


def _write(folder: Path, name: str, index: Index) -> None:
    """Write to a temporary file and put it in place in one step; a folder that cannot be written is passed over."""
    body = msgspec.msgpack.encode(index)
    temporary = ""
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.NamedTemporaryFile(dir=folder, prefix="index-", suffix=".part", delete=False) as file:
            temporary = file.name
            file.write(hashlib.blake2b(body, digest_size=_CHECK_SIZE).digest() + body)
        os.replace(temporary, folder / name)
        temporary = ""
        old = sorted(folder.glob("index-*.msgpack"), key=lambda item: item.stat().st_mtime, reverse=True)
        for item in old[_KEPT:]:
            item.unlink(missing_ok=True)
    except OSError:
        pass
    finally:
        if temporary:
            Path(temporary).unlink(missing_ok=True)
