"""A module imports only from its own layer and those above it, so that nothing flows backwards."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

import carboy

PACKAGE = Path(carboy.__file__).resolve().parent
# from the top, as DEVELOPERS.md has them; a layer may use those before it
LAYERS = (
    "errors",
    "span",
    "datafiles",
    "cache",
    "model",
    "text",
    "knowledge",
    "chemistry",
    "reasoning",
    "bench",
    "hazards",
    "planning",
    "vetting",
    "reports",
    "rulebook",
    "cli",
)
# modules that stand in another layer than the folder they are in, with the reason
PLACED = {
    "carboy.rulebook.book": ("knowledge", "loads the rules as the index is loaded; the engine starts from both"),
}
# errors show a place in a text, so the two know each other
TOGETHER = {frozenset(("errors", "span"))}


def module_name(file: Path) -> str:
    parts = ["carboy", *file.relative_to(PACKAGE).with_suffix("").parts]
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


FILES = {module_name(file): file for file in sorted(PACKAGE.rglob("*.py"))}


def imported(file: Path) -> Iterator[str]:
    """Modules of carboy that a file imports anywhere, within functions and for types too."""
    for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names if alias.name.split(".")[0] == "carboy")
        elif isinstance(node, ast.ImportFrom) and node.module and node.module.split(".")[0] == "carboy":
            assert node.level == 0
            for alias in node.names:
                whole = f"{node.module}.{alias.name}"
                yield whole if whole in FILES else node.module


def layer(module: str) -> str:
    """Name of the layer; empty for the package itself, which holds the version and the public names."""
    if module in PLACED:
        return PLACED[module][0]
    return module.split(".")[1] if "." in module else ""


def test_every_module_has_a_layer():
    found = {layer(module) for module in FILES} - {"", "__main__"}
    assert found <= set(LAYERS)


def test_what_is_placed_elsewhere_still_exists():
    assert set(PLACED) <= set(FILES)


@pytest.mark.parametrize("module", [name for name in FILES if layer(name) not in ("", "__main__")])
def test_imports_go_upward(module):
    mine = LAYERS.index(layer(module))
    for other in imported(FILES[module]):
        assert other in FILES, f"{module} imports {other}, which does not exist"
        name = layer(other)
        if not name or frozenset((layer(module), name)) in TOGETHER:
            continue
        assert LAYERS.index(name) <= mine, f"{module} ({layer(module)}) imports {other} ({name})"


def test_only_the_package_itself_may_import_from_every_layer():
    """And it does so lazily: importing carboy brings in no other module of it."""
    tree = ast.parse(FILES["carboy"].read_text(encoding="utf-8"))
    at_once = [node for node in tree.body if isinstance(node, ast.Import | ast.ImportFrom)]
    assert [
        node for node in at_once if isinstance(node, ast.ImportFrom) and (node.module or "").startswith("carboy")
    ] == []
