"""The table of names of the index, built when it is compiled.

Keys: a folded name of a substance or material as it is; others with a mark in front: ``formula:`` (as written, plain),
``lower:`` (the same in lower case), ``hill:`` (by atoms), ``cas:``, ``smiles:`` (as written, as RDKit writes it, and that
without stereochemistry), ``container:``, ``class:``, ``gas:`` (folded names), ``ion:`` (folded name of an ion, without the
word), ``spelling:`` (another way to write the formula of an ion, without its charge). A name that fits two things is a
fault; a formula or SMILES that fits two (isomers, mixtures) is left out, so that it is asked back.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from carboy.knowledge.folding import fold
from carboy.model.knowledge import ChemicalClass, Container, Gas, Material, Species, Substance
from carboy.text.formulas import Atoms, hill_formula, is_formula, parse_formula, plain_formula, split_token


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
    structures: Mapping[str, Iterable[str]],
) -> tuple[dict[str, str], list[NameClashError]]:
    """All names -> what they mean, and the clashes. ``structures``: substance id -> its SMILES as RDKit writes them."""
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
    _add_formulas(table, substances, structures)
    for kind, ids in (("substance", substances), ("material", materials)):
        for identifier in ids:
            table.names.setdefault(fold(identifier), f"{kind}:{identifier}")
    return table.names, table.clashes


def add_ions(
    names: dict[str, str], species: Mapping[str, Species], synonyms: Mapping[str, Iterable[str]]
) -> list[NameClashError]:
    """Add names and spellings of the dissolved ions to the table ``names``; the clashes.

    A name is the preferred one up to a comma and without the word ion. Among the ``synonyms`` (token -> other names) one
    that ends in the charge (``CH3COO-``) is a spelling of the formula.
    """
    table = _Table(names)
    for token, item in species.items():
        if item.phase != "aq" or not item.charge:
            continue
        target = f"species:{token}"
        preferred = item.name.partition(",")[0].removesuffix(" ion").strip()
        if preferred:
            table.add(f"ion:{fold(preferred)}", target, item.name)
        for other in synonyms.get(token, ()):
            formula, charge = split_token(other)
            if charge and " " not in other and is_formula(formula):
                if charge != item.charge or parse_formula(formula).atoms != item.atoms:
                    table.clashes.append(NameClashError(other, "another composition:", target))
                table.add(f"spelling:{plain_formula(formula)}", target, other)
            else:
                table.add(f"ion:{fold(other)}", target, other)
    return table.clashes


def _add_formulas(table: _Table, substances: Mapping[str, Substance], structures: Mapping[str, Iterable[str]]) -> None:
    """Formulas of substances that no name has taken; of several with one formula the plain one (zinc, not zinc
    powder) or none.
    """
    by_key: dict[str, list[str]] = {}
    for item in substances.values():
        formula = plain_formula(item.formula)
        by_key.setdefault(f"formula:{formula}", []).append(item.id)
        for smiles in dict.fromkeys([item.smiles, *structures.get(item.id, ())] if item.smiles else ()):
            by_key.setdefault(f"smiles:{smiles}", []).append(item.id)
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
    def __init__(self, names: dict[str, str] | None = None) -> None:
        self.names: dict[str, str] = {} if names is None else names
        self.clashes: list[NameClashError] = []

    def add(self, key: str, target: str, name: str) -> None:
        known = self.names.setdefault(key, target)
        if known != target:
            self.clashes.append(NameClashError(name, known, target))
