"""What a label describes though the graph does not list it: a structure (SMILES) or a salt of known ions.

Before a case is carried out, :func:`admit` makes such things substances of the index of that run, so that everything
behind it meets substances only. What is not known of them is said in the notes.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property
from typing import Literal

import msgspec
from msgspec import Struct

from carboy.errors import InputError
from carboy.knowledge.naming import composition_key
from carboy.knowledge.salts import Salt, SaltReader
from carboy.knowledge.structures import ClassPatterns, Part, Structure, read_structure
from carboy.model.knowledge import Index, Species, Substance
from carboy.model.plan import Add, Case, Ingredient, Portion, Rinse, Step
from carboy.text.formulas import molar_mass, parse_sum

Phase = Literal["s", "l", "g"]

_WATER, _PROTON = "H2O", "H+"
_SOLID_FORMS = frozenset(
    ("powder", "dust", "pellets", "granules", "flakes", "beads", "chips", "lumps", "crystals", "solid", "shavings")
)


class Admitted(Struct, frozen=True):
    """A case that names substances only, the index that has them all, and what is to be said of those that were made."""

    case: Case
    index: Index
    notes: tuple[str, ...] = ()


def admit(case: Case, index: Index) -> Admitted:
    """Make the structures and unlisted salts of a case substances. Without any, case and index come back as they are.

    Raises InputError for a SMILES string that is no molecule, at its place in the portion.
    """
    maker = _Maker(index)
    ready = _with_portions(case, maker.portion)
    if not maker.notes and ready is case:
        return Admitted(case, index)
    if not maker.substances and not maker.species:
        return Admitted(ready, index, tuple(maker.notes))
    wider = msgspec.structs.replace(
        index,
        substances={**index.substances, **maker.substances},
        species={**index.species, **maker.species},
    )
    return Admitted(ready, wider, tuple(maker.notes))


def _with_portions(case: Case, change: Callable[[Portion], Portion]) -> Case:
    """The case with every portion in it changed; the same case if none is."""
    bottles = {name: change(portion) for name, portion in case.bottles.items()}
    vessels = tuple(
        spec.model_copy(update={"holds": holds}) if (holds := tuple(map(change, spec.holds))) != spec.holds else spec
        for spec in case.vessels
    )
    steps: list[Step] = []
    for step in case.steps:
        if isinstance(step, Add | Rinse) and step.portion is not None:
            portion = change(step.portion)
            steps.append(step if portion is step.portion else step.model_copy(update={"portion": portion}))
        else:
            steps.append(step)
    if bottles == case.bottles and vessels == case.vessels and tuple(steps) == case.steps:
        return case
    return case.model_copy(update={"bottles": bottles, "vessels": vessels, "steps": tuple(steps)})


@dataclass(slots=True)
class _Ions:
    """What the parts of a structure give in water: known species, and ions that had to be made."""

    yields: dict[str, float] = field(default_factory=dict)
    made: list[Species] = field(default_factory=list)

    def add(self, token: str, count: float) -> None:
        total = self.yields.get(token, 0.0) + count
        if total:
            self.yields[token] = total
        else:
            self.yields.pop(token, None)


class _Maker:
    """Collects the records that the portions of one case need."""

    def __init__(self, index: Index) -> None:
        self.index = index
        self.substances: dict[str, Substance] = {}
        self.species: dict[str, Species] = {}
        self.notes: dict[str, None] = {}

    @cached_property
    def patterns(self) -> ClassPatterns:
        return ClassPatterns(self.index.classes)

    @cached_property
    def salts(self) -> SaltReader:
        return SaltReader(self.index)

    def note(self, text: str) -> None:
        self.notes.setdefault(text)

    # --- portions

    def portion(self, portion: Portion) -> Portion:
        ingredients = tuple(self.ingredient(item, portion.form) for item in portion.ingredients)
        solvent = portion.solvent
        if solvent.startswith(("smiles:", "salt:")):
            words = Ingredient(words=portion.solvent_words, reference=solvent)
            solvent = self.ingredient(words, "liquid").reference
        if ingredients == portion.ingredients and solvent == portion.solvent:
            return portion
        return portion.model_copy(update={"ingredients": ingredients, "solvent": solvent})

    def ingredient(self, item: Ingredient, form: str) -> Ingredient:
        kind, _, text = item.reference.partition(":")
        if kind == "salt":
            identity = self.salt(text, item.words)
        elif kind == "smiles":
            identity = self.structure(read_structure(text, span=item.span), item, form)
        else:
            return item
        return item.model_copy(update={"reference": f"substance:{identity}"})

    # --- salts

    def salt(self, text: str, words: str) -> str:
        """The id of the substance for a sum of ions."""
        identity = f"salt:{text}"
        if identity not in self.substances:
            ions = parse_sum(text)
            salt = Salt(tuple(ions.items()))
            atoms: dict[str, float] = {}
            for token, count in ions.items():
                for symbol, number in self.index.species[token].atoms.items():
                    atoms[symbol] = atoms.get(symbol, 0.0) + count * number
            acid = all(self.index.species[token].charge < 0 or token == _PROTON for token in ions)
            self.substances[identity] = Substance(
                id=identity,
                name=self.salts.name(salt),
                formula=self.salts.formula(salt),
                atoms=atoms,
                state="aq" if acid else "s",
                yields=ions,
            )
        name = self.substances[identity].name
        self.note(
            f"'{words}' is not listed in the graph: read as {name}, a salt of its ions ({text}). It is counted as dissolving; its solubility, "
            "heat of dissolving and hazards of its own are not known."
        )
        return identity

    # --- structures

    def listed(self, structure: Structure) -> str | None:
        """The id of the listed substance with this structure."""
        names = self.index.names
        keys = [f"smiles:{text}" for text in (structure.smiles, structure.canonical, structure.flat)]
        if not structure.charge and "C" not in structure.atoms:
            keys.append(composition_key(structure.atoms))
        target = next((names[key] for key in keys if key in names), "")
        kind, _, identity = target.partition(":")
        return identity if kind == "substance" else None

    def structure(self, structure: Structure, item: Ingredient, form: str) -> str:
        """The id of the substance that a structure is."""
        identity = self.listed(structure)
        if identity is not None:
            self.note(self._said_of_listed(structure, item, identity))
            return identity
        if structure.charge:
            raise InputError(
                f"this structure has a charge of {structure.charge:+d}; write its counter-ion too, behind a dot",
                span=item.span,
            )
        if not _molecular(structure):
            raise InputError(
                "this is a metal or an element and no molecule; write its name instead",
                span=item.span,
            )
        identity = f"smiles:{structure.canonical}"
        if identity not in self.substances:
            self._make(identity, structure, item, form)
        return identity

    def _said_of_listed(self, structure: Structure, item: Ingredient, identity: str) -> str:
        known = self.index.substances[identity]
        same = not known.smiles or read_structure(known.smiles).canonical == structure.canonical
        differs = "" if same else "; it differs in stereochemistry or isotopes only"
        return f"'{item.words}' is {known.name}{differs}."

    def _make(self, identity: str, structure: Structure, item: Ingredient, form: str) -> None:
        keys = self.patterns.nearest(self.patterns.classes_of(structure.canonical))
        ions = self._ions(structure)
        if ions is None and len({part.canonical for part in structure.parts if part.formula != _WATER}) > 1:
            raise InputError(
                "these are molecules side by side; give each as an ingredient of its own, as in '1 L of (a + b)'",
                span=item.span,
            )
        phase: Phase = "s" if ions is not None or form in _SOLID_FORMS else "g" if form == "gas" else "l"
        name = item.words
        atoms = structure.atoms
        if ions is None:
            self.species[identity] = Species(
                token=identity,
                formula=structure.formula,
                atoms=atoms,
                charge=0,
                phase=phase,
                name=name,
                classes=keys,
                component=True,
                report_key=identity,
            )
        else:
            for made in ions.made:
                self.species.setdefault(made.token, made)
        self.substances[identity] = Substance(
            id=identity,
            name=name,
            formula=structure.formula,
            atoms=atoms,
            state=phase,
            smiles=structure.smiles,
            classes=keys,
            derived=keys,
            yields={identity: 1.0} if ions is None else ions.yields,
        )
        labels = ", ".join(self.index.classes[key].label for key in keys) or "none that the graph has"
        mass = molar_mass(atoms)
        words = f"'{item.words}' is not listed in the graph: {structure.formula}, {mass:.2f} g/mol, classes by its structure: {labels}."
        if ions is not None:
            words += f" Counted as a salt of {' + '.join(ions.yields)}."
        else:
            words += f" Taken as a {_PHASE_WORDS[phase]}" + (" that does not ionise in water." if phase != "g" else ".")
        words += " Its solubility, volatility, toxicity and heats are not known."
        self.note(words)

    # --- salts written as structures

    def _ions(self, structure: Structure) -> _Ions | None:
        """What a structure of several parts gives in water, or None for one molecule (with or without water)."""
        dry = [part for part in structure.parts if part.formula != _WATER]
        acids = [part for part in dry if self._is_hydrogen_halide(part)]
        others = [part for part in dry if part not in acids]
        if not any(part.charge for part in dry) and not acids:
            return None
        ions = _Ions()
        ions.add(_WATER, float(len(structure.parts) - len(dry)))
        for part in acids:
            self._known(part, ions)
        for part in others:
            bound = len(acids) if part is others[0] and not part.charge else 0
            if self._known(part, ions):
                continue
            self._made(part, bound, ions)
        return ions

    def _is_hydrogen_halide(self, part: Part) -> bool:
        return (
            not part.charge
            and len(part.atoms) == 2
            and part.atoms.get("H") == 1
            and bool({"F", "Cl", "Br", "I"} & part.atoms.keys())
        )

    def _known(self, part: Part, ions: _Ions) -> bool:
        """Add what is known of a part: an inorganic ion by its composition, any other as a listed molecule and its protons."""
        if part.charge and "C" not in part.atoms:
            alike = [
                token
                for token, one in self.index.species.items()
                if one.phase == "aq" and one.charge == part.charge and one.atoms == part.atoms
            ]
            if len(alike) == 1:
                ions.add(alike[0], 1.0)
                return True
            return False
        neutral = _neutralised(part)
        identity = self.listed(neutral) if neutral is not None else None
        if identity is None:
            return False
        for token, count in self.index.substances[identity].yields.items():
            ions.add(token, count)
        if part.charge:
            ions.add(_PROTON, float(part.charge))
        return True

    def _made(self, part: Part, protons: int, ions: _Ions) -> None:
        """Add an ion that the graph does not know; ``protons`` are those that a hydrohalide puts on its base."""
        atoms = dict(part.atoms)
        if protons:
            atoms["H"] = atoms.get("H", 0.0) + protons
        grown = Part(part.canonical, atoms, part.charge + protons)
        token = grown.token if grown.token not in self.index.species else f"{grown.token} ({part.canonical})"
        twin = self.species.get(token)
        if twin is not None and twin.name != part.canonical:
            token = f"{grown.token} ({part.canonical})"
        keys = self.patterns.nearest(self.patterns.classes_of(part.canonical))
        ions.made.append(
            Species(
                token=token,
                formula=grown.formula,
                atoms=atoms,
                charge=grown.charge,
                phase="aq",
                name=part.canonical,
                classes=keys,
                component=True,
                report_key=token,
            )
        )
        ions.add(token, 1.0)
        if protons:
            ions.add(_PROTON, -float(protons))


_PHASE_WORDS = {"s": "solid", "l": "liquid", "g": "gas"}


def _molecular(structure: Structure) -> bool:
    """Whether there is more to it than single atoms of one element."""
    return len(structure.atoms) > 1 or any(sum(part.atoms.values()) > 1 for part in structure.parts)


def _neutralised(part: Part) -> Structure | None:
    """The neutral molecule of an ion that has lost or taken up protons, or the part itself; None if it is no such ion."""
    if not part.charge:
        return read_structure(part.canonical)
    from rdkit import Chem

    molecule = Chem.MolFromSmiles(part.canonical)
    for atom in molecule.GetAtoms():
        charge = atom.GetFormalCharge()
        beside = any(other.GetFormalCharge() * charge < 0 for other in atom.GetNeighbors())
        if not charge or beside:  # a nitro group and the like stay as they are
            continue
        hydrogens = atom.GetTotalNumHs()
        if charge > hydrogens:
            return None
        atom.SetFormalCharge(0)
        atom.SetNoImplicit(True)
        atom.SetNumExplicitHs(hydrogens - charge)
    try:
        neutral = read_structure(Chem.MolToSmiles(molecule))
    except InputError:
        return None
    return None if neutral.charge else neutral
