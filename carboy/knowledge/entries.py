"""What the graph knows of a thing, as a list of facts: each with its value, its source and how it was had from there."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Literal

from carboy.knowledge.names import Names
from carboy.model.knowledge import (
    ChemicalClass,
    Container,
    Equilibrium,
    Gas,
    Index,
    Material,
    Species,
    Substance,
    Value,
)
from carboy.text.formulas import molar_mass

Sort = Literal["substance", "material", "species", "gas", "class", "container material", "source"]
Form = Literal["words", "formula", "equation"]

_MOST_MEMBERS = 60
_STATES = {"s": "solid", "l": "liquid", "g": "gas", "aq": "in water"}


@dataclass(frozen=True, slots=True)
class Fact:
    """One fact. ``value`` is a number with its origin, or ``text`` says it; ``form`` tells what the text is."""

    label: str
    text: str = ""
    value: Value | None = None
    form: Form = "words"
    source: str = ""
    note: str = ""


@dataclass(slots=True)
class Entry:
    """One thing of the graph with its facts."""

    sort: Sort
    id: str
    name: str
    facts: list[Fact] = field(default_factory=list)


def entries(text: str, index: Index, names: Names) -> list[Entry]:
    """Everything that ``text`` may mean, most specific first; empty if nothing. Raises InputError for a wrong CAS number."""
    found: list[Entry] = []
    match = names.resolve(text)
    if match.kind == "substance":
        found.append(_substance(index.substances[match.id], index))
    elif match.kind == "material":
        found.append(_material(index.materials[match.id], index))
    tokens = [match.id] if match.kind == "species" else []
    if text in index.species:
        tokens.append(text)
    if match.kind == "substance":  # the molecule in water, or the solid, that it is there as
        yields = index.substances[match.id].yields
        tokens += [token for token, count in yields.items() if len(yields) == 1 and count == 1.0]
        tokens += [match.id] if match.id in index.species else []
    for token in dict.fromkeys(tokens):
        if token in index.species and token not in index.gases:
            found.append(_species(index.species[token], index))
    gas = names.gas(text) or (next((f"{token}(g)" for token in tokens if f"{token}(g)" in index.gases), None))
    if gas is not None:
        found.append(_gas(index.gases[gas], index))
    group = names.chemical_class(text)
    if group is not None:
        found.append(_class(index.classes[group], index))
    container = names.container(text)
    if container is not None:
        found.append(_container(index.containers[container]))
    if text in index.sources:
        found.append(Entry("source", text, text, [Fact("citation", index.sources[text].citation)]))
    return found


def suggestions(text: str, index: Index, names: Names) -> tuple[str, ...]:
    """Names of any kind that are spelled nearly like ``text``."""
    from rapidfuzz import process  # only where nothing was found

    near = names.suggest(text, 3)
    others = [*index.classes, *index.containers, *index.sources, *(gas.name for gas in index.gases.values())]
    found = process.extract(text.lower(), others, limit=3, score_cutoff=80)
    return tuple(dict.fromkeys([*near, *(word for word, _, _ in found)]))[:4]


def _listed(label: str, words: tuple[str, ...] | list[str]) -> Iterator[Fact]:
    if words:
        yield Fact(label, "; ".join(words))


def _valued(label: str, value: Value | None) -> Iterator[Fact]:
    if value is not None:
        yield Fact(label, value=value, source=value.source, note=value.note)


def _all_classes(keys: tuple[str, ...], index: Index) -> list[str]:
    """The stated classes, then those above them."""
    above = dict.fromkeys(up for key in keys for up in index.ancestors.get(key, (key,)))
    return [*keys, *(key for key in above if key not in keys)]


def _substance(item: Substance, index: Index) -> Entry:
    facts = [Fact("formula", item.formula, form="formula")] if item.formula else []
    if item.atoms:
        mass = molar_mass(item.atoms)
        facts.append(Fact("molar mass", f"{mass:.2f} g/mol", note="computed from the atomic weights"))
    facts += _listed("CAS number", item.cas)
    facts += _listed("other names", item.synonyms)
    facts += [Fact("SMILES", item.smiles)] if item.smiles else []
    facts.append(Fact("as bought", _STATES[item.state]))
    facts += _listed("classes", _all_classes(item.classes, index))
    facts += _listed("of these by its structure", item.derived)
    facts += _listed("GHS statements", item.ghs)
    if item.yields and set(item.yields) != {item.id}:  # what stays what it is has nothing to tell
        facts.append(Fact("dissolves into", _sum(item.yields), form="equation"))
    if item.ion:
        facts.append(Fact("ion in dilute acid", item.ion, form="formula"))
    for other, share in item.companions.items():
        facts.append(Fact("its solutions hold besides", f"{share:g} mol of {index.substances[other].name} per mol"))
    for label, value in (
        ("density", item.density),
        ("solubility in water", item.solubility),
        ("enthalpy of formation", item.formation),
        ("boiling point", item.boiling_point),
        ("flash point", item.flash_point),
        ("decomposes from", item.onset),
    ):
        facts += _valued(label, value)
    holders = [one.name for one in index.materials.values() if any(part.substance == item.id for part in one.parts)]
    facts += _listed("in the trade as", holders)
    return Entry("substance", item.id, item.name, facts)


def _sum(yields: dict[str, float]) -> str:
    return " + ".join(token if count == 1.0 else f"{count:g} {token}" for token, count in yields.items() if count > 0)


def _material(item: Material, index: Index) -> Entry:
    facts = list(_listed("other names", item.synonyms))
    facts.append(Fact("as bought", _STATES[item.state]))
    for part in item.parts:
        name = index.substances[part.substance].name
        share = (
            f"{part.typical:g} %"
            if part.low == part.high
            else f"{part.low:g} to {part.high:g} %, usually {part.typical:g} %"
        )
        facts.append(Fact("holds", f"{name}, {share} by mass", source=item.source))
    balance = index.substances[item.balance].name if item.balance in index.substances else item.balance
    facts.append(Fact("the rest is", balance))
    facts += _valued("density", item.density)
    if item.strength_of:
        facts.append(Fact("is meant by", f"concentrated {index.substances[item.strength_of].name}"))
    return Entry("material", item.id, item.name, facts)


def _species(item: Species, index: Index) -> Entry:
    facts = [Fact("phase", {"aq": "in water", "s": "solid", "l": "liquid", "g": "gas"}[item.phase])]
    if item.formula and item.formula != item.token:
        facts.append(Fact("formula", item.formula, form="formula"))
    if item.charge:
        facts.append(Fact("charge", f"{item.charge:+d}"))
    facts += _listed("classes", _all_classes(item.classes, index))
    if item.component and item.report_key:
        facts.append(Fact("in reports", item.report_key))
    facts += _valued("enthalpy of formation", item.formation)
    if item.forms == "slow":
        facts.append(Fact("comes down", "slowly, not while one waits"))
    made = [one for one in index.equilibria if one.product == item.token]
    others = [one for one in index.equilibria if item.token in one.coefficients and one.product != item.token]
    for one in [*made, *(others if len(others) <= _MOST_MEMBERS else [])]:
        facts += _equilibrium(one)
    if len(others) > _MOST_MEMBERS:
        facts.append(Fact("equilibria", f"it takes part in {len(others)}"))
    return Entry("species", item.token, item.name or item.token, facts)


def _equilibrium(item: Equilibrium) -> Iterator[Fact]:
    figure = f"log K {item.printed.magnitude:g} at 25 °C"
    if item.enthalpy is not None:
        figure += f", reaction enthalpy {item.enthalpy.magnitude:.4g} {item.enthalpy.unit}"
    note = f"{figure}; {item.printed.note}" if item.printed.note else figure
    yield Fact("equilibrium", item.reaction, form="equation", source=item.printed.source, note=note)


def _gas(item: Gas, index: Index) -> Entry:
    facts = [Fact("formula", item.formula, form="formula")]
    facts += _listed("CAS number", [item.cas] if item.cas else [])
    record = index.species.get(item.species)
    if record is not None:
        facts += _listed("classes", _all_classes(record.classes, index))
    for label, value in (
        ("IDLH", item.idlh),
        ("ceiling or short-term limit", item.ceiling),
        ("AEGL-2, 10 min", item.aegl2),
        ("AEGL-3, 10 min", item.aegl3),
        ("lower flammable limit", item.lower_flammable),
        ("upper flammable limit", item.upper_flammable),
        ("density against air", item.density_air),
        ("odour threshold", item.odour),
    ):
        facts += _valued(label, value)
    facts += _listed("warning by smell", [item.odour_warning] if item.odour_warning else [])
    facts += _listed("colour", [item.colour] if item.colour else [])
    facts += _listed("note", [item.note] if item.note else [])
    for one in index.equilibria:
        if one.product == item.species:
            facts += _equilibrium(one)
    return Entry("gas", item.species, item.name, facts)


def _class(item: ChemicalClass, index: Index) -> Entry:
    facts = [Fact("scope", item.note)] if item.note else []
    facts += _listed("structures that match", item.smarts)
    facts += _listed("but not", item.not_smarts)
    facts += _listed("is a kind of", item.broader)
    facts += _listed("kinds of it", sorted(key for key, one in index.classes.items() if item.key in one.broader))
    everything: list[Substance | Species] = [*index.substances.values(), *index.species.values()]
    members = sorted(
        {
            one.name or one.token if isinstance(one, Species) else one.name
            for one in everything
            if not (isinstance(one, Species) and one.token in index.substances)
            and any(item.key in index.ancestors.get(key, ()) for key in one.classes)
        }
    )
    shown = members[:_MOST_MEMBERS]
    more = len(members) - len(shown)
    if shown:
        facts.append(Fact(f"members ({len(members)})", "; ".join(shown) + (f" and {more} more" if more else "")))
    return Entry("class", item.key, item.label, facts)


def _container(item: Container) -> Entry:
    facts = list(_listed("other names", item.synonyms))
    facts += _valued("gauge pressure it stands", item.rating)
    for attack in sorted(item.attacks, key=lambda one: one.rating != "unsuitable"):
        facts.append(Fact(f"{attack.rating} for", attack.attacker, source=attack.source, note=attack.reason))
    return Entry("container material", item.id, item.name, facts)


def bounds(value: Value) -> tuple[float, ...]:
    """The figure of a value, or its ends where only these are known."""
    if value.low is not None and value.high is not None and math.isfinite(value.low):
        return value.low, value.high
    return (value.magnitude,)
