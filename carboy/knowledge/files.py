"""The Turtle files of a knowledge folder and the digest of their content."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

import carboy
from carboy.datafiles import data_dir
from carboy.errors import KnowledgeError

SCHEMA = "schema.ttl"
SHAPES = "shapes.ttl"

# Code that decides what the compiled index holds; a change there must not meet an index compiled before it.
_PACKAGE = Path(__file__).resolve().parent.parent
_COMPILING_CODE = (
    *(
        f"knowledge/{name}.py"
        for name in (
            "cas",
            "compile",
            "equilibria",
            "folding",
            "loading",
            "naming",
            "structures",
            "treatments",
            "vocabulary",
        )
    ),
    "text/formulas.py",
    "model/knowledge.py",
)


def read_files(path: Path | None = None) -> dict[str, bytes]:
    """Name relative to the folder (with ``/``) -> bytes of every Turtle file, sorted by name; ``path`` None is the
    shipped kb/.

    Raises KnowledgeError for a folder without schema.ttl or a file that cannot be read.
    """
    folder = path if path is not None else data_dir("kb")
    if not (folder / SCHEMA).is_file():
        raise KnowledgeError(f"'{folder.name}' is no knowledge folder: it holds no {SCHEMA}")
    try:
        return {file.relative_to(folder).as_posix(): file.read_bytes() for file in sorted(folder.rglob("*.ttl"))}
    except OSError as error:
        raise KnowledgeError(f"a knowledge file cannot be read: {error.strerror}") from error


def _rdkit_version() -> str:
    """RDKit's release writes the canonical SMILES; asked of its metadata, so that it is not imported."""
    try:
        return version("rdkit")
    except PackageNotFoundError:
        return ""


def digest(files: Mapping[str, bytes]) -> str:
    """BLAKE2b of names and contents, of the versions of carboy and RDKit and of the compiling code: equal only if the
    index would be equal.
    """
    state = hashlib.blake2b(f"{carboy.__version__} {_rdkit_version()}".encode(), digest_size=20)
    for name in _COMPILING_CODE:
        code = _PACKAGE / name
        if code.is_file():
            state.update(code.read_bytes())
    for name, content in files.items():
        # lengths first, so that no two different sets of files run together to the same bytes
        state.update(f"\0{name}\0{len(content)}\0".encode())
        state.update(content)
    return state.hexdigest()
