"""What ``import carboy`` gives, and what it costs."""

from __future__ import annotations

import subprocess
import sys

import pytest

import carboy


def test_public_names_are_there():
    for name in carboy.__all__:
        assert getattr(carboy, name) is not None
    assert set(carboy.__all__) <= set(dir(carboy))


def test_unknown_name():
    with pytest.raises(AttributeError, match="no attribute 'bottle'"):
        carboy.bottle  # noqa: B018


def test_importing_it_brings_in_nothing_heavy():
    code = "import sys, carboy; print(*sorted(m for m in sys.modules if m.split('.')[0] in ('numpy', 'pydantic', 'carboy', 'networkx')))"
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.split() == ["carboy"]


def test_a_check_from_the_cache_imports_no_parser_of_knowledge_or_rules():
    """A one-off check must not pay for Turtle, SHACL, YAML or the grammar."""
    code = (
        "import sys, carboy; carboy.combine('10 mL of water', '10 mL of water'); "
        "print(*sorted({m.split('.')[0] for m in sys.modules} & {'rdflib', 'pyshacl', 'pyparsing', 'ruamel', 'rapidfuzz', "
        "'rich', 'typer', 'networkx', 'rdkit'}))"
    )
    carboy.combine("10 mL of water", "10 mL of water")  # fills the cache
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.split() == []
