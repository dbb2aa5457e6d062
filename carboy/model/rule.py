"""A rule of rules/ as a syntax tree: frozen records that know no parser.

The reference of the language is rules/README.md. A *term* names what a clause is about: a bound variable (``?s``),
a species token (``HS-``) or the id of a substance (``acetone``).
"""

from __future__ import annotations

from typing import Literal

from msgspec import Struct

Where = Literal["any", "dissolved", "solid", "gas", "liquid", "reachable"]
Speed = Literal["at once", "minutes", "hours", "days"]
Compare = Literal["above", "below", "between", "at least", "at most"]
Kind = Literal[
    "toxic-gas",
    "flammable-gas",
    "asphyxiant-gas",
    "oxygen",
    "pressure",
    "heat",
    "foam",
    "fire",
    "explosive",
    "polymerization",
    "toxic-product",
    "remobilised",
    "incomplete",
    "attack",
]


class Place(Struct, frozen=True):
    """Where a clause stands: file, line, column (both from 1)."""

    file: str
    line: int
    column: int


class Bound(Struct, frozen=True, tag="is"):
    """``?s is sulfide or selenide, dissolved``: binds a variable to each thing present that has one of the classes and none of
    ``but_not``. ``classes`` may hold species tokens and substance ids too (``?o is ClO- or H2O2``)."""

    variable: str
    classes: tuple[str, ...]
    but_not: tuple[str, ...] = ()
    where: Where = "any"
    place: Place | None = None


class Present(Struct, frozen=True, tag="present"):
    """``H2O2 present`` or ``no H2O2`` / ``no sulfide, dissolved`` (``negated``); ``term`` is a token, substance id or class."""

    term: str
    negated: bool = False
    where: Where = "any"
    place: Place | None = None


class Measured(Struct, frozen=True, tag="measured"):
    """A condition on a number of the vessel.

    ``quantity``: "pH", "temperature" (degC), "water fraction" (mass/mass), "ionic strength" (mol/kg), "headspace" (L),
    "strength" (mol/L of ``term``), "mass fraction" (of ``term``, 0..1), "amount" (mol of ``term``), "mass" (g of ``term``),
    "ratio" (mol ``term`` per mol ``other``), "property" (``other`` names it: "charge", "oxidation state", "carbons").
    Values are in the units given here; the reader converts. ``between`` has both ends, ``at least``/``at most`` include the end.
    """

    quantity: str
    compare: Compare
    low: float
    high: float
    term: str = ""
    other: str = ""
    place: Place | None = None


class Vessel(Struct, frozen=True, tag="vessel"):
    """``cover is sealed``, ``container is glass or aluminium`` (``words`` alternatives; ``negated`` for ``is not``)."""

    about: Literal["cover", "container"]
    words: tuple[str, ...]
    negated: bool = False
    place: Place | None = None


class Earlier(Struct, frozen=True, tag="earlier"):
    """``earlier ?m is mercury-compound``: was in this vessel at an earlier step, whatever became of it. ``filtered`` = since then the
    vessel was not filtered when True is asked for by ``not filtered since``."""

    variable: str
    classes: tuple[str, ...]
    place: Place | None = None


class Meeting(Struct, frozen=True, tag="meeting"):
    """``?a meets ?b``: the two came from different pours (one was in the vessel, the other is being added in this step)."""

    first: str
    second: str
    place: Place | None = None


Condition = Bound | Present | Measured | Vessel | Earlier | Meeting


class ReactionTerm(Struct, frozen=True):
    """One term of an equation: ``2 HClO``, ``?m``, ``?m.ion``. ``coefficient`` None: found by balance.

    ``part`` (after the dot) is a relation in the graph from the bound thing to a species: ``ion`` (the cation a metal gives),
    ``acid`` (the protonated neutral form of an anion), ``anion``, ``metal`` (cation of a solid), ``oxidised``, ``reduced``.
    """

    term: str
    part: str = ""
    coefficient: float | None = None


class Reaction(Struct, frozen=True):
    """One ``does`` line. ``when`` conditions hold for this branch only. ``share`` is the range of conversion (0..1) of the scarcest reactant."""

    reactants: tuple[ReactionTerm, ...]
    products: tuple[ReactionTerm, ...]
    balance: bool  # coefficients are to be found by element and charge balance at binding time
    text: str
    when: tuple[Condition, ...] = ()
    share: tuple[float, float] = (1.0, 1.0)
    place: Place | None = None


class Flag(Struct, frozen=True):
    """``flags KIND of TERM when CONDITIONS``. ``terms`` may be empty (heat, pressure, foam) or hold words in quotes for a consequence
    known only by class (``flags explosive of "organic peroxides"``). ``weighed_by`` names the bound term whose amount judges it."""

    kind: Kind
    terms: tuple[str, ...] = ()
    words: str = ""
    weighed_by: str = ""
    grade: Literal["", "danger", "warning", "note"] = ""  # the most that it may be, where only the class is known
    moment: Literal["", "contact", "during", "after", "storage"] = ""
    when: tuple[Condition, ...] = ()
    place: Place | None = None


class Example(Struct, frozen=True):
    """A ``fires`` or ``silent`` line: portions joined by ' + ' in the order of pouring; settings after ``|``."""

    text: str
    portions: tuple[str, ...]
    setting: dict[str, str] = {}  # "cover", "container", "wait", "temperature"
    expect: str = ""  # after "->": a species token or kind that must be in the finding
    known_miss: str = ""  # reason, where the line is known to fail
    place: Place | None = None


class Rule(Struct, frozen=True):
    """One rule. ``needs`` are the conditions in order; ``does`` the alternative or parallel branches."""

    id: str
    title: str
    needs: tuple[Condition, ...]
    does: tuple[Reaction, ...]
    speed: Speed
    flags: tuple[Flag, ...]
    says: str
    guard: tuple[str, ...]
    cites: tuple[str, ...]
    fires: tuple[Example, ...]
    silent: tuple[Example, ...]
    moment: Literal["", "contact", "during", "after", "storage"] = ""
    off: str = ""  # reason for which it is switched off
    place: Place | None = None
