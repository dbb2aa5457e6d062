"""Checked facts -> the compiled index: composition and balance of everything, equilibria in components, names, closed
hierarchy.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from difflib import get_close_matches
from typing import TYPE_CHECKING, Literal, cast

from carboy.errors import InputError
from carboy.knowledge.cas import check_digit_fits
from carboy.knowledge.equilibria import PrintedEquilibrium, reduce_to_components
from carboy.knowledge.loading import Facts, Node
from carboy.knowledge.naming import add_ions, build_names
from carboy.knowledge.problems import Problem
from carboy.knowledge.repair_reagents import repair_reagents
from carboy.knowledge.spot_tests import spot_tests
from carboy.knowledge.treatments import liquid_hazards, treatments, untreatable
from carboy.model.knowledge import (
    Attack,
    ChemicalClass,
    Container,
    Enthalpy,
    Equilibrium,
    Gas,
    Index,
    Limit,
    Material,
    MaterialPart,
    Phase,
    Source,
    Species,
    Substance,
    Threshold,
    Value,
)
from carboy.text.formulas import (
    Composition,
    check_balance,
    elements,
    imbalance,
    parse_equation,
    parse_formula,
    parse_sum,
    parse_token,
    split_token,
)

if TYPE_CHECKING:
    from carboy.knowledge.structures import ClassPatterns

_GHS = re.compile(r"H\d{3}[A-Za-z]{0,2}(?:\+H\d{3}[A-Za-z]{0,2})*|EUH\d{3}[A-Z]?")
_PHASES: Mapping[str, Phase] = {":Component": "aq", ":Species": "aq", ":Solid": "s", ":Gas": "g"}
_WATER, _PROTON = "H2O", "H+"


def compile_index(facts: Facts) -> tuple[Index, list[Problem]]:
    """The index and what is wrong with the facts; with any error the index is incomplete and must not be used."""
    compiler = _Compiler(facts)
    index = compiler.run()
    return index, compiler.problems


class _Compiler:
    def __init__(self, facts: Facts) -> None:
        self.facts = facts
        self.problems: list[Problem] = []
        self.species: dict[str, Species] = {}
        self.groups: dict[str, dict[str, float]] = {}  # ligand names in tokens -> atoms
        self.derived: dict[str, tuple[str, ...]] = {}  # substance id -> classes by its structure
        self.written: dict[str, tuple[str, ...]] = {}  # substance id -> its structure as RDKit writes it

    def run(self) -> Index:
        self._check_elements()
        classes, class_synonyms = self._classes()
        self._declared_species()
        substances = {node.name.partition(":")[2]: node for node in self.facts.of_type(":Substance")}
        compositions = {key: self._substance_atoms(node) for key, node in substances.items()}
        self._structures(substances, classes)
        self._molecular_species(substances, compositions)
        equilibria = self._equilibria()
        self._lone_species(equilibria)
        records = {key: self._substance(key, node, compositions[key]) for key, node in substances.items()}
        materials = {node.name.partition(":")[2]: self._material(node) for node in self.facts.of_type(":Material")}
        containers = {node.name.partition(":")[2]: self._container(node) for node in self.facts.of_type(":Container")}
        gases = {node.name.partition(":")[2]: self._gas(node) for node in self.facts.of_type(":Gas")}
        names, clashes = build_names(records, materials, containers, classes, gases, class_synonyms, self.written)
        clashes += add_ions(names, self.species, self._ion_synonyms())
        for clash in clashes:
            self._report(self._node_of(clash.second), str(clash))
        return Index(
            sources={
                node.name.partition(":")[2]: Source(node.name.partition(":")[2], node.text("dct:bibliographicCitation"))
                for node in self.facts.of_type("dct:BibliographicResource")
            },
            classes=classes,
            species=self.species,
            equilibria=tuple(equilibria.values()),
            substances=records,
            materials=materials,
            gases=gases,
            containers=containers,
            dilution=tuple(self._dilution(node) for node in self.facts.of_type(":DilutionEnthalpy")),
            thresholds=self._thresholds(),
            limits=self._limits(),
            names=names,
            ancestors=self._ancestors(classes),
            hazards=liquid_hazards(self.facts, self._value),
            treatments=treatments(self.facts),
            untreatable=untreatable(self.facts),
            repair_reagents=repair_reagents(self.facts),
            spot_tests=spot_tests(self.facts, self.species, self._report),
        )

    # --- small helpers

    def _report(self, node: Node | None, message: str) -> None:
        self.problems.append(node.problem(message) if node else Problem("", "", message))

    def _node_of(self, target: str) -> Node | None:
        """``substance:acetone`` -> its node."""
        kind, _, key = target.partition(":")
        prefix = {"substance": "sub", "material": "mat", "container": "con", "class": "cls"}.get(kind, "sp")
        return self.facts.things.get(f"{prefix}:{key}")

    def _value(self, node: Node, key: str) -> Value | None:
        part = node.part(key)
        if part is None:
            return None
        unit, source = part.ref(":unit"), part.ref(":source")
        magnitude = part.number(":magnitude")
        note = part.text(":note")
        if key == ":solubility" and note.startswith("miscible"):
            magnitude = math.inf
        if unit is None or source is None or magnitude is None:
            return None  # reported by the loader
        return Value(
            magnitude=magnitude,
            unit=self.facts.vocabulary.units.get(unit.name, unit.local),
            source=source.local,
            basis=part.text(":basis"),
            note=note,
            low=part.number(":low"),
            high=part.number(":high"),
        )

    @staticmethod
    def _classes_of(node: Node) -> tuple[str, ...]:
        return tuple(ref.local for ref in node.refs(":class"))

    # --- classes and elements

    def _check_elements(self) -> None:
        """The formula reader takes elements.ttl line by line; both readings must agree."""
        read = elements()
        for node in self.facts.of_type(":Element"):
            symbol = node.name.partition(":")[2]
            weight = self._value(node, ":atomicWeight")
            known = read.get(symbol)
            if known is None or known.weight != (weight.magnitude if weight else None):
                self._report(
                    node, "the formula reader takes this line otherwise; keep each element on one line as in the others"
                )

    def _classes(self) -> tuple[dict[str, ChemicalClass], dict[str, tuple[str, ...]]]:
        classes, synonyms = {}, {}
        for node in self.facts.of_type("skos:Concept"):
            key = node.name.partition(":")[2]
            classes[key] = ChemicalClass(
                key=key,
                label=node.text("skos:prefLabel"),
                broader=tuple(ref.local for ref in node.refs("skos:broader")),
                note=node.text("skos:scopeNote"),
                smarts=node.texts(":smarts"),
                not_smarts=node.texts(":notSmarts"),
            )
            synonyms[key] = node.texts("skos:altLabel")
        return classes, synonyms

    def _ancestors(self, classes: Mapping[str, ChemicalClass]) -> dict[str, tuple[str, ...]]:
        """Class -> itself and all above, nearest first. A circle is reported."""
        closed = {}
        for key in classes:
            order = [key]
            for current in order:
                for above in classes[current].broader if current in classes else ():
                    if above == key:
                        self._report(self.facts.things.get(f"cls:{key}"), "is above itself in the hierarchy of classes")
                    if above not in order:
                        order.append(above)
            closed[key] = tuple(order)
        return closed

    # --- structures

    def _structures(self, substances: Mapping[str, Node], classes: Mapping[str, ChemicalClass]) -> None:
        """The classes that the structures of substances add to the stated ones, and how RDKit writes them."""
        for key, item in classes.items():
            if item.not_smarts and not item.smarts:
                self._report(self.facts.things.get(f"cls:{key}"), "has :notSmarts, but no :smarts to take them from")
        drawn = {key: node for key, node in substances.items() if node.text(":smiles")}
        if not drawn:
            return
        from carboy.knowledge.structures import faulty_patterns, read_structure

        for key, item in classes.items():
            for text in faulty_patterns(item):
                self._report(self.facts.things.get(f"cls:{key}"), f"'{text}' is no SMARTS pattern")
        patterns = self._patterns(classes)
        for key, node in drawn.items():
            try:
                structure = read_structure(node.text(":smiles"))
            except InputError as error:
                self._report(node, f":smiles: {error.message}")
                continue
            self.written[key] = tuple(dict.fromkeys((structure.canonical, structure.flat)))
            if patterns is not None:
                found = patterns.nearest(patterns.classes_of(node.text(":smiles")))
                above = {up for stated in self._classes_of(node) for up in patterns.ancestors(stated)}
                self.derived[key] = tuple(one for one in found if one not in above)

    @staticmethod
    def _patterns(classes: Mapping[str, ChemicalClass]) -> ClassPatterns | None:
        from carboy.knowledge.structures import ClassPatterns

        try:
            return ClassPatterns(classes)
        except InputError:  # each faulty one is reported by itself
            return None

    # --- species

    def _ion_synonyms(self) -> dict[str, tuple[str, ...]]:
        """Other names and ways of writing of species."""
        return {
            node.name.partition(":")[2]: node.texts("skos:altLabel")
            for node in self.facts.of_type(":Component", ":Species")
            if node.texts("skos:altLabel")
        }

    def _declared_species(self) -> None:
        """Components, solids, gases; components first, because their names may be ligands in the tokens of others."""
        nodes = self.facts.of_type(":Component", ":Solid", ":Gas")
        nodes.sort(key=lambda node: node.type != ":Component")
        for node in nodes:
            token = node.name.partition(":")[2]
            composition = self._declared_composition(node, token)
            if composition is None:
                continue
            atoms, charge = composition
            self.species[token] = Species(
                token=token,
                formula=node.text(":formula") or split_token(token.removesuffix("(g)"))[0],
                atoms=dict(atoms),
                charge=charge,
                phase=_PHASES[node.type],
                name=node.text("skos:prefLabel"),
                classes=self._classes_of(node),
                component=node.type == ":Component",
                report_key=node.text(":reportKey"),
                formation=self._value(node, ":formation"),
                forms="slow" if node.text(":forms") == "slow" else "fresh",
                acid_interaction=self._value(node, ":acidInteraction"),
            )
        for token in (_WATER, _PROTON):
            if token not in self.species or not self.species[token].component:
                self.problems.append(Problem("species", f"sp:{token}", "must be declared as a :Component"))

    def _declared_composition(self, node: Node, token: str) -> Composition | None:
        """Atoms and charge from the formula and from the token, which must agree where both can be read."""
        formula_text = node.text(":formula")
        stated = node.number(":charge")
        try:
            formula = parse_formula(formula_text) if formula_text else None
        except InputError as error:
            self._report(node, f":formula: {error.message}")
            return None
        core, token_charge = split_token(token)
        try:
            read = None if node.type == ":Solid" else parse_token(token, self.groups)
        except InputError as error:
            if formula is None:
                self._report(node, f"the token is no formula ({error.message}), so it needs :formula")
                return None
            read = None
            if node.type == ":Component":
                self.groups[core] = formula.atoms
        if formula is not None and formula.charge:
            self._report(node, ":formula is written without charge")
        if node.type == ":Gas" and (read is None or read.state != "g"):
            self._report(node, "the token of a gas is its formula and (g)")
        if read is not None and formula is not None and _differ(read.atoms, formula.atoms):
            self._report(node, f":formula {formula_text} and the token have different atoms")
        charge = read.charge if read is not None else 0 if node.type == ":Solid" else token_charge
        if stated is not None and stated != charge:
            if read is None and core == token:  # a name without a charge at its end
                charge = int(stated)
            else:
                self._report(node, f":charge is {stated:g}, but the token says {charge}")
        chosen = formula or read
        return None if chosen is None else (chosen.atoms, charge)

    def _substance_atoms(self, node: Node) -> dict[str, float]:
        text = node.text(":formula")
        if not text:
            return {}
        try:
            formula = parse_formula(text)
        except InputError as error:
            self._report(node, f":formula: {error.message}")
            return {}
        if formula.charge:
            self._report(node, ":formula of a substance has no charge")
        return formula.atoms

    def _molecular_species(self, substances: Mapping[str, Node], compositions: Mapping[str, dict[str, float]]) -> None:
        """A substance that does not ionise is a species by itself, named by its id."""
        for key, node in substances.items():
            if node.text(":dissolvesInto") or not compositions[key]:
                continue
            known = self.species.get(key)
            if known is not None:
                self._report(node, f"has no :dissolvesInto, yet sp:{key} is declared too; state what it dissolves into")
                continue
            self.species[key] = Species(
                token=key,
                formula=node.text(":formula"),
                atoms=compositions[key],
                charge=0,
                phase=cast(Phase, node.text(":state") or "s"),
                name=node.text("skos:prefLabel"),
                classes=(*self._classes_of(node), *self.derived.get(key, ())),
                component=True,
                report_key=key,
                formation=self._value(node, ":formation"),
            )

    def _composition(self, token: str) -> Composition:
        """Atoms and charge of any token of a reaction. Raises InputError."""
        known = self.species.get(token)
        if known is not None:
            return known.atoms, known.charge
        formula = parse_token(token, self.groups)
        return formula.atoms, formula.charge

    # --- equilibria

    def _equilibria(self) -> dict[str, Equilibrium]:
        printed: dict[str, PrintedEquilibrium] = {}
        nodes: dict[str, Node] = {}
        for node in self.facts.of_type(":Equilibrium"):
            item = self._printed(node)
            if item is None:
                continue
            if item.product in printed:
                first = nodes[item.product]
                self._report(
                    node, f"{item.product} is formed twice; the first is in {first.problem('').place}: {first.name}"
                )
                continue
            printed[item.product], nodes[item.product] = item, node
        components = {token for token, item in self.species.items() if item.component}
        reduced, faults = reduce_to_components(printed.values(), components)
        for product, fault in faults.items():
            self._report(nodes[product], fault)
        for product in reduced:
            self._add_complex(product)
        return reduced

    def _printed(self, node: Node) -> PrintedEquilibrium | None:
        """One equilibrium, its reaction read and balanced; None (and a Problem) if that fails."""
        product_ref, text, constant = node.ref(":forms"), node.text(":reaction"), self._value(node, ":log10K")
        if product_ref is None or not text or constant is None:
            if node.texts(":forms"):
                self._report(node, ":forms takes the species that is formed (sp:...)")
            return None
        product = product_ref.local
        known = self.species.get(product)
        if known is not None and known.component:
            self._report(node, f"forms {product}, which is a component")
            return None
        try:
            equation = parse_equation(text)
            for token in equation.net:
                self._composition(token)
            check_balance(equation, self._composition)
        except InputError as error:
            self._report(node, error.message)
            return None
        if abs(equation.net.get(product, 0.0)) != 1:
            self._report(node, f"{product} must stand in the reaction once, with coefficient 1")
            return None
        kinds: dict[str, Literal["aqueous", "solid", "gas"]] = {"s": "solid", "g": "gas"}
        kind = kinds.get(known.phase, "aqueous") if known else "aqueous"
        note = node.text(":note")
        if note and not constant.note:
            constant = Value(
                constant.magnitude, constant.unit, constant.source, constant.basis, note, constant.low, constant.high
            )
        return PrintedEquilibrium(product, kind, equation, constant, self._value(node, ":reactionEnthalpy"))

    def _add_complex(self, token: str) -> None:
        """The species that an equilibrium forms, with the classes and the name stated for it elsewhere."""
        if token in self.species:
            return
        atoms, charge = self._composition(token)
        node = self.facts.things.get(f"sp:{token}")
        self.species[token] = Species(
            token=token,
            formula=(node.text(":formula") if node else "") or split_token(token)[0],
            atoms=dict(atoms),
            charge=charge,
            phase="aq",
            name=node.text("skos:prefLabel") if node else "",
            classes=self._classes_of(node) if node else (),
            formation=self._value(node, ":formation") if node else None,
            acid_interaction=self._value(node, ":acidInteraction") if node else None,
        )

    def _lone_species(self, equilibria: Mapping[str, Equilibrium]) -> None:
        """A solid or gas without an equilibrium is a building block of nothing but itself."""
        for token, item in list(self.species.items()):
            if not item.component and token not in equilibria and item.phase in ("s", "g"):
                self.species[token] = Species(
                    **{
                        name: getattr(item, name)
                        for name in item.__struct_fields__
                        if name not in ("component", "report_key")
                    },
                    component=True,
                    report_key=item.report_key or token,
                )

    # --- substances, materials

    def _substance(self, key: str, node: Node, atoms: dict[str, float]) -> Substance:
        for number in node.texts(":cas"):
            self._check_cas(node, number)
        for code in node.texts(":ghs"):
            if not _GHS.fullmatch(code):
                self._report(node, f":ghs '{code}' is no H or EUH code")
        companions = {}
        for part in node.parts(":companion"):
            other, ratio = part.ref(":substance"), part.number(":molPerMol")
            if other is not None and ratio is not None:
                companions[other.local] = ratio
        ion = node.ref(":ion")
        return Substance(
            id=key,
            ion=ion.local if ion is not None else "",
            name=node.text("skos:prefLabel"),
            formula=node.text(":formula"),
            atoms=atoms,
            state=cast(Phase, node.text(":state") or "s"),
            synonyms=node.texts("skos:altLabel"),
            cas=node.texts(":cas"),
            smiles=node.text(":smiles"),
            classes=(*self._classes_of(node), *self.derived.get(key, ())),
            derived=self.derived.get(key, ()),
            ghs=node.texts(":ghs"),
            yields=self._yields(node, key, atoms),
            density=self._value(node, ":density"),
            solubility=self._value(node, ":solubility"),
            formation=self._value(node, ":formation"),
            boiling_point=self._value(node, ":boilingPoint"),
            flash_point=self._value(node, ":flashPoint"),
            onset=self._value(node, ":onset"),
            companions=companions,
        )

    def _check_cas(self, node: Node, number: str) -> None:
        if not check_digit_fits(number):
            self._report(node, f":cas {number} is no CAS number (form or check digit)")

    def _yields(self, node: Node, key: str, atoms: dict[str, float]) -> dict[str, float]:
        """Species per formula unit on dissolution, with the water that balances it."""
        text = node.text(":dissolvesInto")
        if not text:
            return {key: 1.0} if key in self.species else {}
        try:
            yields = parse_sum(text)
        except InputError as error:
            self._report(node, f":dissolvesInto: {error.message}")
            return {}
        for token in yields:
            if token not in self.species:
                near = get_close_matches(token, self.species, 2)
                hint = f"; did you mean {' or '.join(near)}?" if near else ""
                self._report(node, f":dissolvesInto names {token}, which is no species{hint}")
                return {}
        if not atoms:
            return yields
        surplus = {symbol: -count for symbol, count in atoms.items()}
        for symbol, value in imbalance(yields, self._composition).items():
            surplus[symbol] = surplus.get(symbol, 0.0) + value
        water = -surplus.get("O", 0.0)
        left_over = {
            symbol: value + {"O": water, "H": 2 * water}.get(symbol, 0.0)
            for symbol, value in {"H": 0.0, **surplus}.items()
        }
        if any(abs(value) > 1e-6 for value in left_over.values()):
            table = ", ".join(f"{symbol} {value:+g}" for symbol, value in left_over.items() if abs(value) > 1e-6)
            self._report(
                node, f":dissolvesInto '{text}' is not balanced with {node.text(':formula')} and water: {table}"
            )
        total = yields.get(_WATER, 0.0) + water
        if abs(total) > 1e-9:
            yields[_WATER] = total
        return yields

    def _material(self, node: Node) -> Material:
        parts = []
        for part in node.parts(":part"):
            substance = part.ref(":substance")
            low, typical, high = part.number(":low"), part.number(":typical"), part.number(":high")
            if substance is None or low is None or typical is None or high is None:
                continue
            if not 0 <= low <= typical <= high <= 100:
                self._report(part, f"{substance.name}: low, typical, high must rise from 0 to 100 % at most")
            parts.append(MaterialPart(substance.local, low, typical, high))
        if sum(part.low for part in parts) > 100 or sum(part.typical for part in parts) > 100.5:
            self._report(node, "its parts are more than 100 %")
        balance, strength = node.ref(":balance"), node.ref(":strengthOf")
        return Material(
            id=node.name.partition(":")[2],
            name=node.text("skos:prefLabel"),
            synonyms=node.texts("skos:altLabel"),
            state=cast(Phase, node.text(":state") or "l"),
            parts=tuple(sorted(parts, key=lambda part: (-part.typical, part.substance))),
            balance=balance.local if balance else "water",
            density=self._value(node, ":density"),
            source=", ".join(ref.local for ref in node.refs(":source")),
            strength_of=strength.local if strength else "",
        )

    # --- gases, containers, heats, numbers

    def _gas(self, node: Node) -> Gas:
        token = node.name.partition(":")[2]
        numbers = node.texts(":cas")
        for number in numbers:
            self._check_cas(node, number)
        lower, upper = self._value(node, ":lowerFlammable"), self._value(node, ":upperFlammable")
        if lower and upper and not lower.magnitude < upper.magnitude <= 100:
            self._report(node, "its flammable range does not rise from lower to upper")
        return Gas(
            species=token,
            formula=node.text(":formula") or token.removesuffix("(g)"),
            name=node.text("skos:prefLabel"),
            cas=numbers[0] if numbers else "",
            idlh=self._value(node, ":idlh"),
            ceiling=self._value(node, ":ceiling"),
            aegl2=self._value(node, ":aegl2"),
            aegl3=self._value(node, ":aegl3"),
            lower_flammable=lower,
            upper_flammable=upper,
            density_air=self._value(node, ":densityAir"),
            odour=self._value(node, ":odour"),
            odour_warning=node.text(":odourWarning"),
            colour=node.text(":colour"),
            note=node.text(":note"),
        )

    def _container(self, node: Node) -> Container:
        attacks = []
        for part in node.parts(":attack"):
            attacker, source = part.ref(":attacker"), part.ref(":source")
            if attacker is None or source is None or not part.text(":rating"):
                continue
            rating = cast(Literal["limited", "unsuitable"], part.text(":rating"))
            attacks.append(Attack(attacker.local, rating, part.text(":reason"), source.local))
        return Container(
            id=node.name.partition(":")[2],
            name=node.text("skos:prefLabel"),
            synonyms=node.texts("skos:altLabel"),
            attacks=tuple(attacks),
            rating=self._value(node, ":typicalRating"),
        )

    def _dilution(self, node: Node) -> Enthalpy:
        points = []
        for part in node.parts(":point"):
            water, heat = part.number(":waterPerMole"), part.number(":heat")
            if water is not None and heat is not None:
                points.append((water, heat))

        def local(key: str) -> str:
            return ", ".join(ref.local for ref in node.refs(key))

        return Enthalpy(
            local(":electrolyte"), local(":cation"), local(":anion"), tuple(sorted(points)), local(":source")
        )

    def _thresholds(self) -> dict[str, Threshold]:
        found = {}
        for node in self.facts.of_type(":Threshold"):
            key, value = node.name.partition(":")[2], self._value(node, ":value")
            if value is not None:
                found[key] = Threshold(key, value, node.text(":reason"))
        return found

    def _limits(self) -> tuple[Limit, ...]:
        keys = {item.report_key for item in self.species.values() if item.component} | elements().keys()
        found = []
        for node in self.facts.of_type(":Limit"):
            ref, value = node.ref(":subject"), self._value(node, ":value")
            subject = ref.local if ref else node.text(":subject")
            if value is None or not subject:
                continue
            if ref is None and subject not in keys:
                self._report(node, f":subject '{subject}' is neither an element nor the report key of a component")
            if value.unit != "mg/L":
                self._report(node, f"has the unit {value.unit}; it must be unit:MilliGM-PER-L")
            kind = cast(
                Literal[
                    "toxicity-characteristic",
                    "universal-treatment-wastewater",
                    "universal-treatment-leachate",
                    "metal-finishing-daily-maximum",
                ],
                node.text(":kind"),
            )
            found.append(Limit(subject, value, kind))
        return tuple(found)


def _differ(first: Mapping[str, float], second: Mapping[str, float]) -> bool:
    return any(abs(first.get(symbol, 0.0) - second.get(symbol, 0.0)) > 1e-6 for symbol in {*first, *second})
