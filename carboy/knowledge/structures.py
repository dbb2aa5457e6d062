"""Structures: a SMILES string to its formula, its canonical form and the chemical classes that its structure puts it in.

RDKit is imported by the first call that needs it, so that a run without a structure does not pay for it. The classes'
patterns (SMARTS) are data of the graph: :class:`~carboy.model.knowledge.ChemicalClass`.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import TYPE_CHECKING

from msgspec import Struct

from carboy.errors import InputError
from carboy.model.knowledge import ChemicalClass
from carboy.span import Span
from carboy.text.formulas import charge_suffix, elements, hill_formula

if TYPE_CHECKING:
    from rdkit.Chem import Mol

MOST_ATOMS = 1000  # heavier structures are no label of a bottle, and matching them would take long
_REASON = re.compile(
    r"Explicit valence for atom # (?P<place>\d+) (?P<symbol>\w+), (?P<valence>\d+), is greater than permitted"
)


class Part(Struct, frozen=True):
    """One molecule or ion of a structure (what stands between the dots of a SMILES string)."""

    canonical: str
    atoms: dict[str, float]
    charge: int

    @property
    def formula(self) -> str:
        """Formula in the order of Hill, without charge."""
        return hill_formula(self.atoms)

    @property
    def token(self) -> str:
        """Formula with the charge at its end."""
        return self.formula + charge_suffix(self.charge)


class Structure(Struct, frozen=True):
    """What a SMILES string says. ``canonical`` keeps stereochemistry, ``flat`` leaves it and isotopes out; both are RDKit's."""

    smiles: str
    canonical: str
    flat: str
    parts: tuple[Part, ...]

    @property
    def atoms(self) -> dict[str, float]:
        """Atoms of all parts."""
        total: dict[str, float] = {}
        for part in self.parts:
            for symbol, count in part.atoms.items():
                total[symbol] = total.get(symbol, 0.0) + count
        return total

    @property
    def charge(self) -> int:
        return sum(part.charge for part in self.parts)

    @property
    def formula(self) -> str:
        """Formula of the whole in the order of Hill."""
        return hill_formula(self.atoms)


def read_structure(smiles: str, *, span: Span | None = None) -> Structure:
    """The structure that a SMILES string writes down.

    Raises InputError (at ``span``, or at the string) for a string that is no SMILES, breaks a valence, holds open ends,
    isotopes of no element, or more than ``MOST_ATOMS`` atoms.
    """
    where = span or Span(smiles, 0, max(1, len(smiles)))
    molecule = _molecule(smiles, where)
    if not molecule.GetNumAtoms():
        raise InputError("this SMILES string holds no atom", span=where)
    if molecule.GetNumAtoms() > MOST_ATOMS:
        raise InputError(f"this structure has more than {MOST_ATOMS} atoms", span=where)
    for atom in molecule.GetAtoms():
        if atom.GetSymbol() not in elements() or atom.GetAtomicNum() == 0:
            raise InputError("this structure has an open end (*); only whole molecules can be vetted", span=where)
        if atom.GetNumRadicalElectrons() and atom.GetSymbol() in ("C", "H", "O"):
            raise InputError(
                f"an atom of this structure ({atom.GetSymbol()}) lacks bonds; check the hydrogens in square brackets",
                span=where,
            )
    from rdkit import Chem

    flat = Chem.Mol(molecule)
    Chem.RemoveStereochemistry(flat)
    for atom in flat.GetAtoms():
        atom.SetIsotope(0)
    flat = Chem.RemoveHs(flat)
    fragments = Chem.GetMolFrags(molecule, asMols=True)
    parts = tuple(Part(Chem.MolToSmiles(one), _atoms(one), Chem.GetFormalCharge(one)) for one in fragments)
    return Structure(smiles, Chem.MolToSmiles(molecule), Chem.MolToSmiles(flat), parts)


class ClassPatterns:
    """The patterns of all classes that have some, compiled once."""

    def __init__(self, classes: Mapping[str, ChemicalClass]) -> None:
        """Raises InputError for a pattern that is no SMARTS; see :func:`faulty_patterns` for a list of all."""
        self._patterns = {
            key: (tuple(map(_pattern, one.smarts)), tuple(map(_pattern, one.not_smarts)))
            for key, one in classes.items()
            if one.smarts
        }
        self._above = {key: _ancestors(key, classes) for key in classes}

    def classes_of(self, smiles: str) -> tuple[str, ...]:
        """Keys of the classes whose patterns a structure matches, in the order of the graph. Raises InputError."""
        molecule = _molecule(smiles, Span(smiles, 0, max(1, len(smiles))))
        return tuple(
            key
            for key, (wanted, unwanted) in self._patterns.items()
            if any(map(molecule.HasSubstructMatch, wanted)) and not any(map(molecule.HasSubstructMatch, unwanted))
        )

    def ancestors(self, key: str) -> frozenset[str]:
        """A class and all above it."""
        return self._above.get(key, frozenset((key,)))

    def nearest(self, keys: tuple[str, ...]) -> tuple[str, ...]:
        """``keys`` without those that stand above another of them."""
        implied = {up for key in keys for up in self._above.get(key, ()) if up != key}
        return tuple(key for key in keys if key not in implied)

    def unfounded(self, stated: tuple[str, ...], derived: tuple[str, ...]) -> tuple[str, ...]:
        """Stated classes that have patterns, none of which (nor of a class below) is in the structure."""
        above = {up for key in derived for up in self._above.get(key, (key,))}
        return tuple(key for key in stated if key in self._patterns and key not in above)


def faulty_patterns(item: ChemicalClass) -> tuple[str, ...]:
    """Patterns of a class that are no SMARTS."""
    faults = []
    for text in (*item.smarts, *item.not_smarts):
        try:
            _pattern(text)
        except InputError:
            faults.append(text)
    return tuple(faults)


def _ancestors(key: str, classes: Mapping[str, ChemicalClass]) -> frozenset[str]:
    found = [key]
    for current in found:
        found += [up for up in (classes[current].broader if current in classes else ()) if up not in found]
    return frozenset(found)


def _pattern(text: str) -> Mol:
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        pattern = Chem.MolFromSmarts(text)
    if pattern is None:
        raise InputError(f"'{text}' is no SMARTS pattern")
    return pattern


def _molecule(smiles: str, where: Span) -> Mol:
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        molecule = Chem.MolFromSmiles(smiles)
        if molecule is not None:
            return molecule
        loose = Chem.MolFromSmiles(smiles, sanitize=False)
        if loose is None:
            raise InputError("this is no SMILES string: a bond, ring or bracket of it is not complete", span=where)
        try:
            Chem.SanitizeMol(loose)
        except ValueError as error:
            raise InputError(f"no molecule can have this structure: {_plainly(str(error))}", span=where) from None
    raise InputError("this SMILES string cannot be read", span=where)


def _plainly(reason: str) -> str:
    found = _REASON.search(reason)
    if found:
        return f"atom {int(found['place']) + 1} ({found['symbol']}) has {found['valence']} bonds"
    if "kekulize" in reason.lower():
        return "its aromatic ring (small letters) does not close; a hydrogen may be missing, as in [nH]"
    return reason.strip().rstrip(".").lower()


def _atoms(molecule: Mol) -> dict[str, float]:
    counts: dict[str, float] = {}
    for atom in molecule.GetAtoms():
        counts[atom.GetSymbol()] = counts.get(atom.GetSymbol(), 0.0) + 1
        hydrogens = atom.GetTotalNumHs()
        if hydrogens:
            counts["H"] = counts.get("H", 0.0) + hydrogens
    return counts
