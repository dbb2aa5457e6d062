"""Records of the knowledge graph: species, equilibria, substances, materials, gases, classes, containers, sources.

They are msgspec structs because the compiled index is read on every run and must load in milliseconds.
Species are named by *tokens*: an aqueous ion or molecule by its formula with the charge at the end (``HS-``,
``Hg+2``, ``SO4-2``, ``H2O2``), a solid by its own name (``metacinnabar``), a gas by its formula and ``(g)`` (``H2S(g)``),
a molecule of many atoms by the id of its substance (``acetone``).
"""

from __future__ import annotations

from typing import Literal

from msgspec import Struct

Phase = Literal["aq", "s", "l", "g"]


class Value(Struct, frozen=True):
    """A number with its origin: magnitude, unit, key of the source, and how it was had from there."""

    magnitude: float
    unit: str
    source: str
    basis: str = ""  # "looked up", "library value", "computed", "from memory", "common practice"
    note: str = ""
    low: float | None = None
    high: float | None = None


class Source(Struct, frozen=True):
    """Where a fact was read."""

    key: str
    citation: str


class ChemicalClass(Struct, frozen=True):
    """A SKOS concept; ``broader`` are the classes directly above.

    A structure belongs to it if it matches one of ``smarts`` and none of ``not_smarts``; a class without ``smarts`` is stated only.
    """

    key: str  # kebab-case, singular: "metal-sulfide"
    label: str
    broader: tuple[str, ...] = ()
    note: str = ""
    smarts: tuple[str, ...] = ()
    not_smarts: tuple[str, ...] = ()


class Species(Struct, frozen=True):
    """One kind of particle, solid or gas that a vessel can hold."""

    token: str
    formula: str  # plain formula without charge, as in the report: "HS", "HgS", "H2S"
    atoms: dict[str, float]
    charge: int
    phase: Phase
    name: str = ""
    classes: tuple[str, ...] = ()  # stated ones; the index closes them upward
    component: bool = False  # True: a building block of the equilibria, or of nothing but itself
    report_key: str = ""  # for components: "Cr(VI)", "S(-II)", "CN", "Zn"
    formation: Value | None = None  # enthalpy of formation, kJ/mol
    forms: Literal["fresh", "slow"] = "fresh"  # solids: "slow" ones do not come down while one waits
    acid_interaction: Value | None = None  # anions: coefficient of interaction with H+, log10, kg/mol


class Equilibrium(Struct, frozen=True):
    """Formation of ``product`` from components, 25 degC, ionic strength 0.

    ``a(product) = 10**log10_beta * prod(a(component)**coefficient)``; for a gas the left side is its partial pressure in atm,
    for a solid it is the saturation ratio. ``H2O`` and ``H+`` are among the coefficients. ``reaction``, ``printed`` give the
    reaction and log K as the source has them.
    """

    product: str
    kind: Literal["aqueous", "solid", "gas"]
    coefficients: dict[str, float]
    log10_beta: float
    reaction: str
    printed: Value
    enthalpy: Value | None = None  # of the reaction as printed, kJ/mol
    enthalpy_formation: float | None = None  # of the formation from components, kJ/mol; None if unknown


class Substance(Struct, frozen=True):
    """What stands on a label as one chemical."""

    id: str  # kebab-case of the preferred name
    name: str
    formula: str  # with its water of crystallisation: "Na2S·9H2O"
    atoms: dict[str, float]
    state: Phase  # as bought: "s", "l", "g"; "aq" for one known only in solution
    synonyms: tuple[str, ...] = ()
    cas: tuple[str, ...] = ()
    smiles: str = ""
    classes: tuple[str, ...] = ()  # stated ones, then those that its structure adds
    derived: tuple[str, ...] = ()  # those of `classes` that nobody stated: by its structure
    ghs: tuple[str, ...] = ()
    yields: dict[str, float] = {}  # species per formula unit when it dissolves, H2O balanced in (may be negative)
    density: Value | None = None  # g/mL
    solubility: Value | None = None  # g/L of water near 20-25 degC; magnitude inf for miscible
    formation: Value | None = None  # kJ/mol, state as bought
    boiling_point: Value | None = None  # degC
    flash_point: Value | None = None  # degC
    onset: Value | None = None  # degC, where it begins to decompose by itself
    ion: str = ""  # for a metal: the cation that dilute acid makes of it
    companions: dict[str, float] = {}  # substance id -> mol per mol, what a solution of it always holds besides


class MaterialPart(Struct, frozen=True):
    """One ingredient of a trade material, mass per cent low, typical, high."""

    substance: str
    low: float
    typical: float
    high: float


class Material(Struct, frozen=True):
    """What a laboratory buys under a trade-generic name."""

    id: str
    name: str
    synonyms: tuple[str, ...]
    state: Phase
    parts: tuple[MaterialPart, ...]  # the rest is water, unless `balance` says otherwise
    balance: str = "water"
    density: Value | None = None
    source: str = ""
    strength_of: str = ""  # substance id for which this is what "concentrated" means


class Gas(Struct, frozen=True):
    """Limits of a gas or vapour in air. ppm by volume, vol %, relative density."""

    species: str  # token of the gas, "H2S(g)"
    formula: str
    name: str
    cas: str = ""
    idlh: Value | None = None
    ceiling: Value | None = None  # the lowest ceiling or short-term limit
    aegl2: Value | None = None  # 10 min
    aegl3: Value | None = None
    lower_flammable: Value | None = None  # vol %
    upper_flammable: Value | None = None
    density_air: Value | None = None
    odour: Value | None = None
    odour_warning: str = ""  # "adequate", "poor", "none"
    colour: str = ""
    note: str = ""


class Attack(Struct, frozen=True):
    """What a container material does under a class of reagents."""

    attacker: str  # class key or substance id
    rating: Literal["limited", "unsuitable"]
    reason: str
    source: str


class Container(Struct, frozen=True):
    """A vessel or equipment material."""

    id: str
    name: str
    synonyms: tuple[str, ...] = ()
    attacks: tuple[Attack, ...] = ()
    rating: Value | None = None  # typical bottle's gauge pressure, kPa


class Enthalpy(Struct, frozen=True):
    """Relative apparent molar enthalpy of an electrolyte against dilution: points (mol water per mol, kJ/mol set free on
    dilution from there to infinity)."""

    electrolyte: str  # substance id
    cation: str  # component tokens
    anion: str
    points: tuple[tuple[float, float], ...]
    source: str


class Threshold(Struct, frozen=True):
    """One number of the assessment, with its reason."""

    key: str
    value: Value
    reason: str


class Limit(Struct, frozen=True):
    """A regulatory limit on a liquid or leachate, mg/L, for a report key (``Hg``) or substance."""

    subject: str
    value: Value
    kind: Literal[
        "toxicity-characteristic",
        "universal-treatment-wastewater",
        "universal-treatment-leachate",
        "metal-finishing-daily-maximum",
    ]


class LiquidHazard(Struct, frozen=True):
    """What makes a liquid waste that must be treated: too much of some species in the liquid, or a pH outside a window.

    ``species`` are tokens of components whose dissolved amount counts; ``classes`` those of labelled substances and of components. ``above``
    is in mg/L of the element that the report key names, or of the whole species.
    """

    id: str
    name: str
    species: tuple[str, ...] = ()
    classes: tuple[str, ...] = ()
    except_classes: tuple[str, ...] = ()
    above: Value | None = None
    pH_low: Value | None = None
    pH_high: Value | None = None


class Demand(Struct, frozen=True):
    """mol of agent that one mol of a species uses up."""

    species: str
    mol_per_mol: float


class Stage(Struct, frozen=True):
    """One act of a treatment. ``reagent`` is read like a label without its amount; ``agent`` is the species that is counted in it.
    ``raise`` and ``lower`` bring the pH into the window and are left out where it is there, or beyond it."""

    order: int
    action: Literal["raise", "lower", "dose", "stir", "stand", "filter"]
    reagent: str = ""
    agent: str = ""
    demands: tuple[Demand, ...] = ()
    excess: float = 1.0
    pH_low: float | None = None
    pH_high: float | None = None
    minutes: float = 0.0
    test: str = ""


class Treatment(Struct, frozen=True):
    """A way to take hazards out of a liquid on the bench. Hazards are named by their ids."""

    id: str
    name: str
    takes: tuple[str, ...]
    stages: tuple[Stage, ...]
    leaves: tuple[str, ...] = ()
    forbidden_by: tuple[str, ...] = ()
    dilute_below: dict[str, float] = {}  # species ("H+" for the proton excess either way) -> mol/L
    harshness: float = 0.0  # 0 a mild reagent to 3 one that needs the greatest care
    products: str = ""
    goes_to: str = ""
    dangers: tuple[str, ...] = ()
    sources: tuple[str, ...] = ()
    note: str = ""
    not_calculated: str = ""  # what it rests on and the equilibria do not hold, so that no route by it can be confirmed


class Untreatable(Struct, frozen=True):
    """What no treatment on the bench is sound for, and why."""

    id: str
    name: str
    hazards: tuple[str, ...]
    reason: str
    sources: tuple[str, ...] = ()


class SpotTest(Struct, frozen=True):
    """A quick test at the bench. ``detects``: report keys, or the words pH, temperature, gas; ``beside_reagent``: report keys of which the
    reagent must bring one for the test to apply, () for any reagent."""

    key: str
    name: str
    shows: str
    procedure: str
    reading: str
    detects: tuple[str, ...]
    beside_reagent: tuple[str, ...] = ()
    above_pH: float | None = None  # below it the test itself is dangerous
    caution: str = ""
    basis: str = ""
    sources: tuple[str, ...] = ()


class Quench(Struct, frozen=True):
    """What a reagent takes away: the class, and how many mol of the reagent one mol needs."""

    against: str
    mol_per_mol: float
    source: str


class RepairReagent(Struct, frozen=True):
    """What a repair may put into a vessel before a step. ``portion_words`` follow the amount on a label ("2 M sodium hydroxide");
    ``brings_pH`` is how far an acid or base is dosed."""

    id: str
    name: str
    portion_words: str
    substance: str
    measured_in: Literal["L", "g"]
    serves: Literal["base", "acid", "quench", "diluent"]
    brings_pH: float | None = None
    quenches: tuple[Quench, ...] = ()
    reason: str = ""
    sources: tuple[str, ...] = ()


class Index(Struct, frozen=True):
    """Everything that a run needs from kb/, compiled."""

    sources: dict[str, Source]
    classes: dict[str, ChemicalClass]
    species: dict[str, Species]
    equilibria: tuple[Equilibrium, ...]
    substances: dict[str, Substance]
    materials: dict[str, Material]
    gases: dict[str, Gas]  # by species token
    containers: dict[str, Container]
    dilution: tuple[Enthalpy, ...]
    thresholds: dict[str, Threshold]
    limits: tuple[Limit, ...]
    names: dict[
        str, str
    ]  # folded name -> "substance:<id>", "material:<id>", "container:<id>", "class:<key>", "gas:<token>"
    ancestors: dict[str, tuple[str, ...]]  # class -> itself and all above
    hazards: dict[str, LiquidHazard] = {}  # of liquids, by id
    treatments: dict[str, Treatment] = {}
    untreatable: dict[str, Untreatable] = {}
    spot_tests: tuple[SpotTest, ...] = ()
    repair_reagents: tuple[RepairReagent, ...] = ()
