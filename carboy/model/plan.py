"""What a user describes: portions, vessels, steps, a case. Names are still words here; the bench layer resolves amounts.

Frozen pydantic models, so that a case can come from YAML, from Python or from a test and is validated alike.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

from carboy.span import Span


class Frozen(BaseModel):
    """Base of the plan's records."""

    model_config = ConfigDict(frozen=True, extra="forbid", arbitrary_types_allowed=True, defer_build=True)


class Interval(Frozen):
    """A number known to lie between ``low`` and ``high`` (equal for a stated figure). ``high`` may be inf for ``at least x``."""

    low: float
    high: float

    @property
    def exact(self) -> bool:
        return self.low == self.high

    def times(self, factor: float) -> Interval:
        """The interval in another unit (``factor`` > 0)."""
        return Interval(low=self.low * factor, high=self.high * factor)


StrengthUnit = Literal[
    "mol/L",
    "eq/L",
    "g/L",
    "w/w",
    "w/v",
    "v/v",
    "mass ppm",
    "concentrated",
    "dilute",
    "saturated",
    "trace",
    "unknown",
    "neat",
]


class Strength(Frozen):
    """How much of an ingredient is in its solution.

    w/w, v/v are fractions 0..1; w/v is g per mL; mass ppm is mg/kg; g/L and mol/L as they say; eq/L is normality.
    The words carry no number (``value`` None); the bench layer gives them their interval from the graph.
    """

    unit: StrengthUnit
    value: Interval | None = None


class Ingredient(Frozen):
    """One named thing of a portion. ``reference`` is ``substance:<id>``, ``material:<id>``, ``smiles:<SMILES>``, ``salt:<sum of ions>``
    for a salt that is not listed, ``unknown`` for the word unknown, or ``unrecognised`` when it can be read but is not known."""

    words: str
    reference: str
    hydrate: float = 0.0  # water molecules per formula unit beyond the resolved substance (copper sulfate + 5)
    strength: Strength = Strength(unit="neat")
    suggestions: tuple[str, ...] = ()
    span: Annotated[Span | None, Field(exclude=True, repr=False)] = None


class Portion(Frozen):
    """What one would read off a label.

    ``amount`` in ``unit``: L, g or mol. ``ingredients`` of one solution (several when in parentheses). ``form``: "powder", "granules", ... when said.
    """

    text: str
    amount: Interval
    unit: Literal["L", "g", "mol"]
    ingredients: tuple[Ingredient, ...]
    solvent: str = "substance:water"
    solvent_words: str = "water"
    pH: Interval | None = None
    form: str = ""

    @property
    def unrecognised(self) -> tuple[Ingredient, ...]:
        return tuple(item for item in self.ingredients if item.reference in ("unrecognised", "unknown"))


class Setting(Frozen):
    """The place. Units: m3/s, m3, degC, kPa."""

    place: str = ""
    hood_flow: Interval | None = None  # m3/s
    room_volume: Interval | None = None  # m3
    air_changes: Interval | None = None  # per hour
    temperature: Interval = Interval(low=25.0, high=25.0)


class VesselSpec(Frozen):
    """A vessel: volume in L, material (container id), cover, pressure rating in kPa gauge, what it holds at the start."""

    name: str
    volume: Interval | None = None
    material: str = "glass"
    cover: Literal["open", "loose", "vented", "sealed"] = "open"
    rating: Interval | None = None
    holds: tuple[Portion, ...] = ()


class Add(Frozen):
    """Pour: a whole bottle, part of one, or a portion. ``over`` in s."""

    kind: Literal["add"] = "add"
    source: str = ""  # bottle or vessel name, "" for a portion written out
    portion: Portion | None = None
    part: Interval | None = None  # of the bottle, in `part_unit`; None = all of it
    part_unit: Literal["L", "g", ""] = ""
    to: str = ""
    over: Interval | None = None


class Absorbent(Frozen):
    """Something dry that takes up liquid and is thrown away wet: filter aid, paper, gloves. ``grams`` dry; ``holds`` mL of liquid per g, None
    for what is usual; ``material``: a container id, for what the liquid does to it; ``words`` as written."""

    grams: float
    holds: float | None = None
    material: str = ""
    words: str = ""


class Filter(Frozen):
    """Filter or decant a vessel: solids to ``cake``, liquid to ``filtrate``; ``retained`` mL of liquid per g of solid, ``passes`` share of solids
    that runs through.

    ``aid`` stays with the cake, ``paper`` goes to ``waste``. ``first_runnings`` L hold all of what passes and go to ``runnings``; without
    them what passes is in the filtrate."""

    kind: Literal["filter", "decant"]
    vessel: str
    cake: str = ""
    filtrate: str = ""
    retained: float | None = None
    passes: Interval | None = None
    aid: Absorbent | None = None
    paper: Absorbent | None = None
    waste: str = ""
    first_runnings: Interval | None = None
    runnings: str = ""


class Transfer(Frozen):
    """Move the content of a vessel (all, or ``part`` in ``part_unit``) to another, with a ``heel`` L left behind; or take a sample of it."""

    kind: Literal["transfer", "sample"] = "transfer"
    vessel: str
    to: str
    part: Interval | None = None
    part_unit: Literal["L", "g"] = "L"
    heel: Interval | None = None
    over: Interval | None = None


class Rinse(Frozen):
    """Rinse a vessel or wash a cake with a portion. With ``to`` the washings run off there, and the solids keep ``retained`` mL per g; without
    it they stay."""

    kind: Literal["rinse", "wash"] = "rinse"
    vessel: str
    portion: Portion
    to: str = ""
    retained: float | None = None


class Wipe(Frozen):
    """Wipe out a vessel, or take up a spill, with something that is then a contaminated solid in ``to``."""

    kind: Literal["wipe"] = "wipe"
    vessel: str
    absorbent: Absorbent
    to: str


class Temper(Frozen):
    """Heat or cool to a temperature in degC."""

    kind: Literal["heat", "cool"]
    vessel: str = ""
    to: Interval


class Wait(Frozen):
    """Wait, stand, let settle or stir for a time in s."""

    kind: Literal["wait", "stand", "settle", "stir"]
    vessel: str = ""
    duration: Interval | None = None


class Cover(Frozen):
    """Seal, open or vent a vessel."""

    kind: Literal["seal", "open", "vent"]
    vessel: str = ""


class Check(Frozen):
    """Something that must hold before going on: ``quantity`` "pH", "temperature", "dissolved Hg"..."""

    kind: Literal["check"] = "check"
    vessel: str = ""
    quantity: str
    low: float | None = None
    high: float | None = None
    unit: str = ""
    text: str = ""


Step = Annotated[Add | Filter | Transfer | Rinse | Wipe | Temper | Wait | Cover | Check, Field(discriminator="kind")]


class Goal(Frozen):
    """``dissolved mercury in jug below 0.2 mg/L``: what is judged, subject as a report key or element, window.

    ``residual``: of all that belongs to a class (``subject`` its key). ``leached``: what a leaching test draws from a cake; without a
    subject every metal that ``limit`` lists, as its share of the limit. ``limit``: the published limit or ``site`` that the window is from.
    """

    text: str
    quantity: Literal["dissolved", "total", "pH", "residual", "leached"]
    subject: str = ""
    vessel: str = ""
    low: float | None = None
    high: float | None = None
    unit: str = ""
    limit: str = ""


class Expectation(Frozen):
    """One line of ``expect``: a finding that must be there (or be absent), a verdict, or a number of a step.

    ``quantity`` names a step's number ("pH", "dissolved_mol Hg", "gas_mol CO2", "gauge_kPa", "temperature_C", "amount_mol");
    ``low``/``high`` are its window.
    """

    step: int | None = None
    kind: str = ""
    species: str = ""
    signal: str = ""
    moment: str = ""
    rule: str = ""
    absent: bool = False
    verdict: str = ""
    quantity: str = ""
    low: float | None = None
    high: float | None = None
    goal: str = ""
    met: bool | None = None
    words: str = ""  # must occur in the text of some finding, assumption or question
    known_failure: str = ""


class Case(Frozen):
    """A whole procedure."""

    title: str
    setting: Setting = Setting()
    bottles: dict[str, Portion] = {}
    vessels: tuple[VesselSpec, ...] = ()
    steps: tuple[Step, ...]
    goals: tuple[Goal, ...] = ()
    limits: dict[str, str] = {}  # of the site: what (a report key or pH) -> window as written
    expect: tuple[Expectation, ...] = ()
    file: str = ""
