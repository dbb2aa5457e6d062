"""Aims and checks of a procedure: ``dissolved mercury in jug below 0.2 mg/L``, ``pH in tank between 7 and 9``.

::

    goal     = ( "pH" | ["dissolved" | "total" | "residual" | "leached"] subject ) ["in" vessel] window ["in" vessel]
             | "no" subject "left" "in" vessel | subject "destroyed" "in" vessel
             | [subject "in"] vessel "passes" ( "the leaching test" | limit )
    check    = goal | "temperature" ["in" vessel] window
    window   = "below" ( figure | limit ) | "above" figure | "between" a "and" b | a "-" b
    limit    = "the toxicity characteristic" | "40 CFR 268.48" | ... | "the site limit"

The subject becomes a key of the report (``Hg``, ``Cr(VI)``, ``CN``), or the symbol of an element of which several
states are kept apart (``Cr``: all
of them together). Without a word before it the total is meant. Concentrations come in mg/L or mol/L; ``ppm`` is taken
as mg/L, as the tables of limits for waste water do. A published limit goes by its name or by its place in the code; that of
the site stands in the case file. ``left`` and ``destroyed`` mean: below what test papers and strips still show. A residual
may be of a class of things (``oxidiser``).
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from typing import Any, Literal, Protocol

from msgspec import Struct

from carboy.errors import InputError
from carboy.model.plan import Goal
from carboy.text.formulas import elements
from carboy.text.passages import Passage, closest, passage_of
from carboy.text.quantities import read_pH, read_quantity

_COMPARISON = re.compile(
    r"(?:^|\s+)(?:(?:of|is|stays|must be|=)\s+)?(?P<word>below|under|within|less than|at most|no more than|not more than"
    r"|not above|up to|max\.?|<=|<|≤|above|over|more than|at least|no less than|not less than|not below|min\.?|>=|>|≥"
    r"|between|from|of|is|(?=[-\d.]))",
    re.IGNORECASE,
)
_QUANTITY = re.compile(r"\s*(?P<quantity>dissolved|total|residual|leached|pH|temperature)(?!\w)\s*", re.IGNORECASE)
_LEFT = re.compile(
    r"\s*(?:no\s+(?:residual\s+)?(?P<left>\S.*?)\s+(?:is\s+)?left\s+in|(?P<gone>\S.*?)\s+(?:is\s+)?destroyed\s+in)\s+(?:the\s+)?(?P<vessel>\S.*?)\s*",
    re.IGNORECASE,
)
_GONE_IN = re.compile(r"\s*(?P<gone>\S.*?)\s+in\s+(?:the\s+)?(?P<vessel>\S.*?)\s+(?:is\s+)?destroyed\s*", re.IGNORECASE)
_PASSES = re.compile(
    r"\s*(?:(?P<subject>\S.*?)\s+(?:in|of)\s+)?(?:the\s+)?(?P<vessel>\S.*?)\s+passes\s+(?:the\s+)?(?P<limit>\S.*?)\s*",
    re.IGNORECASE,
)
_LEACHING = re.compile(r"leach\w*(?:\s+(?:test|limits?))?|TCLP", re.IGNORECASE)
_SITE = re.compile(r"(?:site|discharge|sewer|local)(?:'s)?(?:\s+own)?(?:\s+discharge)?(?:\s+limits?)?", re.IGNORECASE)
_NAMED_LIMIT = re.compile(
    r"\s*(?:below|under|within|less than|at most|not above|<)\s+(?:the\s+)?(?P<limit>(?=[^\d.])\S.*?|40\s*CFR\b.*?)"
    r"(?:\s+in\s+(?:the\s+)?(?P<vessel>\S.*?))?\s*",
    re.IGNORECASE,
)
_OXIDISERS = ("oxidiser", "oxidizer", "oxidant", "oxidising agent", "oxidizing agent")
_STRONG = "strong oxidiser"  # the class that such words mean in a treated waste: nitrate is none of it
_PLACE = re.compile(r"\s*\b(?:in|of)\s+(?:the\s+)?(?P<vessel>\S.*?)\s*$", re.IGNORECASE)
_ROMAN = ("I", "II", "III", "IV", "V", "VI", "VII", "VIII")
_VALENT = ("mono", "di", "tri", "tetra", "penta", "hexa", "hepta", "octa")
_STATED = re.compile(r"[A-Z][a-z]?\(-?[IV0]+\)")
_VALENCE = re.compile(rf"(?P<prefix>{'|'.join(_VALENT)})valent\s+(?P<element>\w+)", re.IGNORECASE)


class SubjectLookup(Protocol):
    """What the graph knows of elements and ions."""

    def report_keys(self, text: str) -> tuple[str, ...]:
        """Keys of the report that ``text`` covers; () if none."""

    def suggest(self, text: str, n: int = 3) -> Sequence[str]:
        """Known names like ``text``, best first."""

    def chemical_class(self, text: str) -> str | None:
        """Key of a chemical class; None if there is none of this name."""

    def published_limits(self, text: str) -> dict[str, dict[str, float]]:
        """Kind of limit -> mg/L by report key, of the published limits that ``text`` names; {} if none."""

    def no_longer_seen(self) -> float:
        """mol/L below which test papers and strips no longer show a thing."""


class Target(Struct, frozen=True):
    """What a goal or check says: ``quantity``, the report key (or class), the vessel, the window.

    ``unit`` is mg/L or mol/L, degC, or "" for a pH. ``vessel_place`` is where the vessel's name stands (for errors),
    None if none is named.
    """

    quantity: Literal["dissolved", "total", "pH", "temperature", "residual", "leached"]
    subject: str
    vessel: str
    vessel_place: tuple[int, int] | None
    low: float | None
    high: float | None
    unit: str
    limit: str = ""


def parse_target(
    text: str | Passage,
    names: SubjectLookup,
    *,
    with_temperature: bool = False,
    file: str = "",
    site: Mapping[str, Target] | None = None,
) -> Target:
    """Read a goal or (``with_temperature``) a check. ``names`` knows the report keys and published limits; ``site`` has the limits of the
    site by report key. Raises InputError."""
    passage = passage_of(text, file)
    plain, end = passage.plain, len(passage.plain.rstrip())
    what = "a check" if with_temperature else "a goal"
    if end == 0:
        passage.fail(f"{what} is missing here, such as 'pH in tank between 7 and 9'", 0, 0)
    spoken = _destroyed(passage, end, names) or _passes(passage, end, names)
    if spoken is not None:
        return spoken
    found = _QUANTITY.match(plain, 0, end)
    word = found["quantity"].lower() if found else "total"
    quantity: Any = "pH" if word == "ph" else word
    begin = found.end() if found else len(plain) - len(plain.lstrip())
    if quantity == "temperature" and not with_temperature:
        passage.fail(
            "a goal is about a pH or an amount in solution; a temperature can be a 'check' of a step", *passage.word(0)
        )
    # "is" and "of" count only where nothing clearer is said, and the subject comes first
    clear = [m for m in _COMPARISON.finditer(plain, max(begin - 1, 0), end) if m["word"].lower() not in ("of", "is")]
    spoken_first = sorted(clear, key=lambda m: not m["word"])  # "in tank 2 below 1 mg/L": the 2 is no window
    joint = spoken_first[0] if spoken_first else None
    if joint is None:
        passage.fail(f"{what} needs a window, such as 'below 0.2 mg/L' or 'between 7 and 9'", *_last_word(passage, end))
    left = (begin, max(begin, joint.start()))
    right = joint.start("word")
    place: tuple[int, int] | None = None
    if at := _PLACE.search(plain, *left):
        place = at.span("vessel")
        left = (left[0], at.start())
    named = _NAMED_LIMIT.fullmatch(plain, right, end)
    if named is not None and quantity != "temperature":
        subject = "" if quantity == "pH" else _subject(passage, *_stripped(plain, *left), names, what)
        if named["vessel"] is not None and place is None:
            place = named.span("vessel")
        low, high, unit, limit = _named_limit(passage, named, quantity, subject, names, site)
        vessel = passage.text[slice(*place)].strip() if place else ""
        return Target(quantity, subject, vessel, place, low, high, unit, limit)
    low, high, unit, stop = _window(passage, right, end, quantity, what)
    rest = re.compile(r"\s*in\s+(?:the\s+)?(?P<vessel>\S.*?)\s*$", re.IGNORECASE).match(plain, stop, end)
    if rest and place is None:
        place = rest.span("vessel")
    elif plain[stop:end].strip():
        passage.fail(f"'{plain[stop:end].strip()}' cannot be placed here", *_stripped(plain, stop, end))
    subject = ""
    if quantity == "residual":
        subject = _class_or_subject(passage, *_stripped(plain, *left), names, what)
    elif quantity in ("dissolved", "total", "leached"):
        subject = _subject(passage, *_stripped(plain, *left), names, what)
    elif plain[slice(*left)].strip():
        passage.fail(f"'{plain[slice(*left)].strip()}' cannot be placed after '{quantity}'", *_stripped(plain, *left))
    vessel = passage.text[slice(*place)].strip() if place else ""
    return Target(quantity, subject, vessel, place, low, high, unit)


def _destroyed(passage: Passage, end: int, names: SubjectLookup) -> Target | None:
    """``no sulfide left in jug``, ``oxidiser in jug destroyed``."""
    found = _LEFT.fullmatch(passage.plain, 0, end) or _GONE_IN.fullmatch(passage.plain, 0, end)
    if found is None:
        return None
    group = "left" if "left" in found.re.groupindex and found["left"] is not None else "gone"
    subject = _class_or_subject(passage, *found.span(group), names, "a goal")
    place = found.span("vessel")
    return Target(
        "residual",
        subject,
        passage.text[slice(*place)].strip(),
        place,
        None,
        names.no_longer_seen(),
        "mol/L",
        "test papers",
    )


def _passes(passage: Passage, end: int, names: SubjectLookup) -> Target | None:
    """``cake-1 passes the leaching test``, ``mercury in cake-1 passes 40 CFR 268.48``."""
    found = _PASSES.fullmatch(passage.plain, 0, end)
    if found is None:
        return None
    place, words = found.span("vessel"), found["limit"]
    limits = names.published_limits("toxicity characteristic" if _LEACHING.fullmatch(words) else words)
    limits = {kind: table for kind, table in limits.items() if not kind.endswith(_NOT_OF_EXTRACTS)}
    if not limits:
        passage.fail(
            f"'{words}' is no limit on what leaches from a solid; it can be 'the leaching test', "
            "'the toxicity characteristic' or '40 CFR 268.48'",
            *found.span("limit"),
        )
    kind, table = next(iter(limits.items()))
    vessel = passage.text[slice(*place)].strip()
    if found["subject"] is None:
        return Target("leached", "", vessel, place, None, 1.0, "times the limit", kind)
    subject = _subject(passage, *found.span("subject"), names, "a goal")
    if subject not in table:
        passage.fail(
            f"this limit says nothing of '{found['subject']}'; it lists {', '.join(sorted(table))}",
            *found.span("subject"),
        )
    return Target("leached", subject, vessel, place, None, table[subject], "mg/L", kind)


_NOT_OF_EXTRACTS = ("wastewater", "daily-maximum")
_NOT_OF_LIQUIDS = ("leachate",)


def _named_limit(
    passage: Passage,
    found: re.Match[str],
    quantity: str,
    subject: str,
    names: SubjectLookup,
    site: Mapping[str, Target] | None,
) -> tuple[float | None, float | None, str, str]:
    """Window, unit and name of a limit that is given by its name."""
    words = found["limit"]
    at = found.span("limit")
    if _SITE.fullmatch(words):
        own = (site or {}).get("pH" if quantity == "pH" else subject)
        if own is None:
            listed = f"; it lists {', '.join(site)}" if site else "; write them under 'limits'"
            passage.fail(f"the case has no site limit for this{listed}", *at)
        return own.low, own.high, own.unit, "site"
    unfit = _NOT_OF_EXTRACTS if quantity == "leached" else _NOT_OF_LIQUIDS
    limits = {kind: table for kind, table in names.published_limits(words).items() if not kind.endswith(unfit)}
    if not limits or quantity == "pH":
        passage.fail(
            f"'{words}' is neither a figure nor a limit that is known here; it can be 'the toxicity characteristic', "
            "'40 CFR 268.48' or 'the site limit'",
            *at,
        )
    kind, table = next(iter(limits.items()))
    if subject not in table:
        passage.fail(f"this limit says nothing of {subject}; it lists {', '.join(sorted(table))}", *at)
    return None, table[subject], "mg/L", kind


def _class_or_subject(passage: Passage, start: int, end: int, names: SubjectLookup, what: str) -> str:
    """A report key, or the key of a class of things."""
    words = " ".join(passage.plain[start:end].split()).casefold()
    named = _STRONG if words.removesuffix("s") in _OXIDISERS else words
    if len(names.report_keys(words)) != 1 and (found := names.chemical_class(named)) is not None:
        try:
            return _subject(
                passage, start, end, names, what
            )  # "sulfide" is one state of an element and a class as well
        except InputError:
            return f"class:{found}"
    return _subject(passage, start, end, names, what)


def parse_goal(
    text: str | Passage, names: SubjectLookup, *, file: str = "", site: Mapping[str, Target] | None = None
) -> Goal:
    """``dissolved mercury in jug below 0.2 mg/L`` as a Goal.

    Whether the vessel exists is for the reader of the case. Raises InputError.
    """
    passage = passage_of(text, file)
    target = parse_target(passage, names, site=site)
    return goal_of(passage.text.strip(), target, target.vessel)


def goal_of(text: str, target: Target, vessel: str) -> Goal:
    """A target, that is no temperature, as the goal for a vessel."""
    assert target.quantity != "temperature"
    return Goal(
        text=text,
        quantity=target.quantity,
        subject=target.subject,
        vessel=vessel,
        low=target.low,
        high=target.high,
        unit=target.unit,
        limit=target.limit,
    )


def _window(
    passage: Passage, at: int, end: int, quantity: str, what: str
) -> tuple[float | None, float | None, str, int]:
    """The window's ends (None for an open one), its unit, and where it ends."""
    if quantity == "pH":
        reading = read_pH(passage, at, end)
    elif quantity == "temperature":
        reading = read_quantity(passage, at, end, ("temperature",), "a temperature", signed=True)
    else:
        reading = read_quantity(passage, at, end, ("strength",), "a concentration")
    if reading is None:
        start, stop = passage.word(at, end)
        passage.fail(f"{what} needs a figure here", start, stop)
    opened = passage.plain[at:end].lstrip().lower()
    upper_only = bool(re.match(r"below|under|less|at most|no more|not more|not above|up to|max|<|≤", opened))
    lower_only = bool(re.match(r"above|over|more|at least|no less|not less|not below|min|>|≥", opened))
    low = None if upper_only else reading.interval.low
    high = None if lower_only or math.isinf(reading.interval.high) else reading.interval.high
    if low is not None and low == high:
        passage.fail(
            f"{what} needs a window, such as 'below ...' or 'between ... and ...', not one figure",
            reading.start,
            reading.end,
        )
    factors = {"g/L": (1000.0, "mg/L"), "mol/L": (1.0, "mol/L"), "mass ppm": (1.0, "mg/L")}
    if quantity in ("pH", "temperature"):
        return low, high, reading.unit, reading.end
    if reading.unit not in factors:
        passage.fail("a concentration in a goal is given in mg/L or mol/L", reading.start, reading.end)
    factor, unit = factors[reading.unit]
    scaled = [None if value is None else float(f"{value * factor:.12g}") for value in (low, high)]
    return scaled[0], scaled[1], unit, reading.end


def _subject(passage: Passage, start: int, end: int, names: SubjectLookup, what: str) -> str:
    if start >= end:
        passage.fail(f"{what} must say of what, such as 'dissolved mercury'", *passage.word(0))
    words = " ".join(passage.plain[start:end].split())
    keys = names.report_keys(words)
    if not keys and (spelled := _VALENCE.fullmatch(words)):
        state = _ROMAN[_VALENT.index(spelled["prefix"].lower())]
        keys = names.report_keys(f"{spelled['element']}({state})")
    if len(keys) == 1:
        return keys[0]
    roots = {key.partition("(")[0] for key in keys}
    if len(roots) == 1 and set(keys) == set(names.report_keys(*roots)):  # an element in all its states
        return roots.pop()
    stated = [key for key in keys if _STATED.fullmatch(key)]
    if len(stated) == 1:  # "sulfide" is S(-II), and what else is called so is its kin
        return stated[0]
    if keys:
        passage.fail(
            f"'{passage.text[start:end]}' covers several things ({', '.join(keys)}); write a goal for each", start, end
        )
    known = [element.name for element in elements().values()]
    near = closest(words, known, 2, cutoff=75.0) or tuple(other for other in names.suggest(words, 2) if other != words)
    message = f"'{passage.text[start:end]}' is nothing that is counted by itself; name an element or an ion"
    raise InputError(message, span=passage.span(start, end), suggestions=near)


def _stripped(text: str, start: int, end: int) -> tuple[int, int]:
    while start < end and text[start].isspace():
        start += 1
    while end > start and text[end - 1].isspace():
        end -= 1
    return start, end


def _last_word(passage: Passage, end: int) -> tuple[int, int]:
    start = passage.plain.rfind(" ", 0, end) + 1
    return start, end
