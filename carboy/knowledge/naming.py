"""The table of names of the index, built when it is compiled.

Keys: a folded name of a substance or material as it is; others with a mark in front: ``formula:`` (as written, plain),
``lower:`` (the same in lower case), ``hill:`` (by atoms), ``cas:``, ``smiles:``, ``container:``, ``class:``, ``gas:``
(folded names). A name that fits two things is a fault; a formula or SMILES that fits two (isomers, mixtures) is left
out, so that it is asked back.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from carboy.knowledge.folding import fold
from carboy.model.knowledge import ChemicalClass, Container, Gas, Material, Substance
from carboy.text.formulas import Atoms, hill_formula, is_formula, plain_formula


class NameClashError(Exception):
    """A name fits two things."""

    def __init__(self, name: str, first: str, second: str) -> None:
        self.name, self.first, self.second = name, first, second
        super().__init__(f"the name '{name}' fits {first.replace(':', ' ')} and {second.replace(':', ' ')}")


def composition_key(atoms: Atoms) -> str:
    """Key of a formula whose order of writing does not matter, "" where it may (any carbon compound: AgOCN is not
    AgCNO).
    """
    return "" if "C" in atoms else "hill:" + hill_formula(atoms)


def build_names(
    substances: Mapping[str, Substance],
    materials: Mapping[str, Material],
    containers: Mapping[str, Container],
    classes: Mapping[str, ChemicalClass],
    gases: Mapping[str, Gas],
    class_synonyms: Mapping[str, Iterable[str]],
) -> tuple[dict[str, str], list[NameClashError]]:
    """All names -> what they mean, and the clashes."""
    table = _Table()
    for item in substances.values():
        target = f"substance:{item.id}"
        for name in (item.name, *item.synonyms):
            if " " not in name and is_formula(name):  # "CO" must not be found as "Co"
                table.add(f"formula:{plain_formula(name)}", target, name)
            else:
                table.add(fold(name), target, name)
        for number in item.cas:
            table.add(f"cas:{number}", target, number)
    for material in materials.values():
        for name in (material.name, *material.synonyms):
            table.add(fold(name), f"material:{material.id}", name)
    for kind, things in (("container", containers), ("class", classes)):
        for key, thing in things.items():
            label = thing.name if isinstance(thing, Container) else thing.label
            more = thing.synonyms if isinstance(thing, Container) else class_synonyms.get(key, ())
            for name in (label, key, *more):
                table.add(f"{kind}:{fold(name)}", f"{kind}:{key}", name)
    for gas in gases.values():
        if gas.name:
            table.add(f"gas:{fold(gas.name)}", f"gas:{gas.species}", gas.name)
    _add_formulas(table, substances)
    for kind, ids in (("substance", substances), ("material", materials)):
        for identifier in ids:
            table.names.setdefault(fold(identifier), f"{kind}:{identifier}")
    return table.names, table.clashes


def _add_formulas(table: _Table, substances: Mapping[str, Substance]) -> None:
    """Formulas of substances that no name has taken; of several with one formula the plain one (zinc, not zinc
    powder) or none.
    """
    by_key: dict[str, list[str]] = {}
    for item in substances.values():
        formula = plain_formula(item.formula)
        by_key.setdefault(f"formula:{formula}", []).append(item.id)
        if item.smiles:
            by_key.setdefault(f"smiles:{item.smiles}", []).append(item.id)
        key = composition_key(item.atoms)
        if key:
            by_key.setdefault(key, []).append(item.id)
    for key, ids in by_key.items():
        plain = min(ids, key=len)
        if key not in table.names and all(other == plain or other.startswith(plain + "-") for other in ids):
            table.names[key] = f"substance:{plain}"
    lower: dict[str, set[str]] = {}
    for key, target in table.names.items():
        if key.startswith("formula:"):
            lower.setdefault("lower:" + key.removeprefix("formula:").casefold(), set()).add(target)
    for key, targets in lower.items():
        if len(targets) == 1:
            table.names[key] = min(targets)


class _Table:
    def __init__(self) -> None:
        self.names: dict[str, str] = {}
        self.clashes: list[NameClashError] = []

    def add(self, key: str, target: str, name: str) -> None:
        known = self.names.setdefault(key, target)
        if known != target:
            self.clashes.append(NameClashError(name, known, target))
