"""Numbers with units as people write them: ``1 000 mL``, ``10-50 g/L``, ``about 2 L``, ``0,5 M``, ``up to 30 min``.

Every reading is an :class:`~carboy.model.plan.Interval` in one canonical unit per dimension (``UNIT_OF``); a stated
figure has equal ends. What the words of a label are taken to mean:

* ``about``, ``approximately``, ``~``, ``ca.``: 20 % to either side (5 K for a temperature, half a unit for a pH);
* ``up to``, ``at most``, ``less than``: from nothing to the figure;  ``at least``, ``more than``: from the figure to
  infinity;
* ``trace``: ``TRACE``, from nothing to 0.1 % by mass;  ``unknown``: from nothing to infinity;

These are conventions of reading and no measurements.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from typing import Literal

from msgspec import Struct

from carboy.model.plan import Interval, Strength, StrengthUnit
from carboy.text.figures import read_number
from carboy.text.passages import Passage, passage_of, skip_space
from carboy.text.units import NAMES_OF, Unit, read_strength_unit, read_unit, refuse_unit

Dimension = Literal["volume", "mass", "amount", "time", "temperature", "pressure", "flow", "air changes", "pH", "share"]

UNIT_OF: dict[str, str] = {
    "volume": "L",
    "mass": "g",
    "amount": "mol",
    "time": "s",
    "temperature": "degC",
    "pressure": "kPa",
    "flow": "m3/s",
    "air changes": "1/h",
    "pH": "",
    "share": "",
}
ABOUT = 0.20  # share of the figure to either side
ABOUT_KELVIN = 5.0
ABOUT_PH = 0.5
TRACE = Interval(low=0.0, high=0.001)  # mass fraction
PH_LIMITS = (-1.0, 15.0)
UNKNOWN = Interval(low=0.0, high=math.inf)

_ABOUT_WORDS = r"about|approximately|approx\.?|roughly|around|circa|ca\.?|c\.|~"
_UP_WORDS = r"up to|at most|no more than|not more than|not above|less than|below|under|max\.?|maximum|<=|≤|<"
_LEAST_WORDS = r"at least|no less than|not less than|not below|more than|above|over|min\.|minimum|>=|≥|>"
_QUALIFIER = re.compile(
    rf"\s*(?:(?P<about>{_ABOUT_WORDS})|(?P<up>{_UP_WORDS})|(?P<least>{_LEAST_WORDS})|(?P<between>between|from))(?=[\s\d.]|$)\s*",
    re.IGNORECASE,
)
_TO = re.compile(r"\s*(?:-|\.\.+|…)\s*(?=[\d.½¼¾⅓⅔⅛⅜⅝⅞-])|\s+to\s+(?=[+\d.½¼¾⅓⅔⅛⅜⅝⅞-])")
_AND = re.compile(r"\s+(?:and|to)\s+|\s*-\s*")
_EITHER_WAY = re.compile(r"\s*(?:±|\+/-|\+-)\s*(?=[\d.])")


class Reading(Struct, frozen=True):
    """What was read: the interval in the canonical unit ``unit``, where the figures stand, and where the reading
    ends.
    """

    interval: Interval
    unit: str
    start: int
    end: int


def begins_quantity(passage: Passage, at: int, end: int | None = None) -> bool:
    """Whether a figure, with or without ``about`` and the like, stands at ``at``."""
    end = len(passage.plain) if end is None else end
    found = _QUALIFIER.match(passage.plain, at, end)
    where = found.end() if found else skip_space(passage.plain, at, end)
    return read_number(passage, where, end) is not None


def read_quantity(
    passage: Passage,
    at: int,
    end: int,
    dimensions: Sequence[str],
    what: str,
    *,
    signed: bool = False,
    optional: bool = False,
) -> Reading | None:
    """The quantity at ``at`` in one of ``dimensions`` (``strength`` is one too).

    ``what`` names it in errors ("an amount"). ``optional``: a figure whose next word is no such unit gives None, not
    an error.
    None too if no figure stands there. Raises InputError.
    """
    text = passage.plain
    qualifier = _QUALIFIER.match(text, at, end)
    where = qualifier.end() if qualifier else at
    first = read_number(passage, where, end)
    if first is None:
        return None
    begun, second, spread = first[1], None, None
    where = first[2]
    early: tuple[Unit, int] | None = None
    between = bool(qualifier and qualifier["between"])

    def unit_at(place: int) -> tuple[Unit, int] | None:
        for dimension in dimensions:
            found = (
                read_strength_unit(passage, place, end)
                if dimension == "strength"
                else read_unit(passage, place, end, dimension)
            )
            if found:
                return found
        return None

    def second_at(place: int) -> tuple[float, int, int] | None:
        joint = (_AND if between else _TO).match(text, place, end)
        return read_number(passage, joint.end(), end) if joint else None

    if either := _EITHER_WAY.match(text, where, end):
        spread = read_number(passage, either.end(), end)
        where = spread[2] if spread else where
    elif second := second_at(where):
        where = second[2]
    else:
        early = unit_at(where)
        if early and early[1] > where and (second := second_at(early[1])):
            where = second[2]
        elif early and early[1] > where and (either := _EITHER_WAY.match(text, early[1], end)):
            spread = read_number(passage, either.end(), end)
            where = spread[2] if spread else early[1]
    if early and second is None and spread is None:
        late: tuple[Unit, int] | None = early
    else:
        late = unit_at(where)
        if spread and early and not (late and late[1] > where):
            late = (early[0], where)
    relative = False
    if spread and (percent := re.compile(r"\s*%").match(text, where, end)) and (early or unit_at(percent.end())):
        # "10 mL ± 5 %" and "10 ± 5 % mL": a share of the figure
        relative = True
        late = (early[0], percent.end()) if early else unit_at(percent.end())
    if late is None:
        if optional:
            return None
        refuse_unit(passage, where, end, dimensions, what)
    unit, stop = late
    low_unit = early[0] if early and second is not None else unit
    if low_unit.name != unit.name:
        passage.fail(
            f"the two ends of this range are in different kinds of units ({low_unit.name} and {unit.name})", begun, stop
        )
    low = low_unit.canonical(first[0])
    high = unit.canonical(second[0]) if second else low
    if second and low > high:
        passage.fail("this range runs backwards; write the smaller figure first", begun, second[2])
    if spread:
        margin = abs(low) * spread[0] / 100.0 if relative else abs(unit.factor) * spread[0]
        low, high = low - margin, high + margin
        low = max(low, 0.0) if not signed and first[0] >= 0.0 else low
    if qualifier:
        if (qualifier["up"] or qualifier["least"]) and second:
            passage.fail(f"'{qualifier.group().strip()}' takes one figure, not a range", qualifier.start(), second[2])
        if between and not second:
            passage.fail(
                f"'{qualifier.group().strip()}' needs two figures, as in 'between 1 and 2'", qualifier.start(), first[2]
            )
        if qualifier["about"]:
            aside = {"temperature": ABOUT_KELVIN, "pH": ABOUT_PH}.get(dimensions[0])
            low -= aside if aside is not None else ABOUT * abs(low)
            high += aside if aside is not None else ABOUT * abs(high)
        elif qualifier["up"]:
            low = -math.inf if signed else 0.0
        elif qualifier["least"]:
            high = math.inf
    if not signed and (first[0] < 0.0 or (second and second[0] < 0.0)):
        passage.fail(f"{what} cannot be negative", begun, (second or first)[2])
    # twelve digits are more than any label has, and hide the last bits of binary fractions
    return Reading(
        Interval(low=_tidy(low), high=_tidy(high)), unit.name, qualifier.start() if qualifier else begun, stop
    )


def _tidy(value: float) -> float:
    return float(f"{value:.12g}")


def parse_quantity(text: str | Passage, dimension: Dimension, *, file: str = "") -> Interval:
    """The whole of ``text`` as one quantity, in the canonical unit of its dimension (``UNIT_OF``).

    ``unknown`` is 0 to infinity. Times may be sums (``1 h 30 min``). A temperature may be negative. A pH must lie in
    ``PH_LIMITS``; open ends are set to them. Raises InputError with the place.
    """
    passage = passage_of(text, file)
    end = len(passage.plain.rstrip())
    what = NAMES_OF[dimension]
    if end == 0:
        passage.fail(f"{what} is missing here", 0, 0)
    if passage.plain.strip().lower() == "unknown" and dimension not in ("temperature", "pH", "share"):
        return UNKNOWN
    signed = dimension in ("temperature", "pH")
    reading = read_quantity(passage, 0, end, (dimension,), what, signed=signed)
    if reading is None:
        start, stop = passage.word(0, end)
        passage.fail(f"'{passage.text[start:stop]}' is not {what}; a number is needed first", start, stop)
    low, high, where = reading.interval.low, reading.interval.high, reading.end
    while dimension == "time" and where < end and math.isfinite(high):
        more = read_quantity(passage, where, end, ("time",), what) if begins_quantity(passage, where, end) else None
        if more is None:
            break
        low, high, where = low + more.interval.low, high + more.interval.high, more.end
    if skip_space(passage.plain, where, end) < end:
        start, stop = passage.word(where, end)
        passage.fail(f"'{passage.text[start:stop]}' cannot be placed after {what}", start, stop)
    interval = Interval(low=low, high=high)
    if dimension == "pH":
        return _as_pH(passage, interval, reading)
    if dimension == "temperature":
        if high <= -273.15 or (math.isfinite(low) and low < -273.15):
            passage.fail("no temperature is below absolute zero (-273.15 degC)", reading.start, reading.end)
        if any(math.isfinite(figure) and figure > 5000.0 for figure in (low, high)):
            passage.fail("no vessel is as hot as that; check the figure and the unit", reading.start, reading.end)
        if not (math.isfinite(low) and math.isfinite(high)):
            passage.fail("a temperature needs a figure or a range here, not an open end", reading.start, reading.end)
    if dimension == "share" and (high > 1.0):
        passage.fail("a share cannot be more than 100 % (or 1)", reading.start, reading.end)
    return interval


def _as_pH(passage: Passage, interval: Interval, reading: Reading) -> Interval:
    lowest, highest = PH_LIMITS
    figures = [end for end in (interval.low, interval.high) if math.isfinite(end)]
    if any(not lowest <= figure <= highest for figure in figures):
        passage.fail(f"a pH lies between {lowest:g} and {highest:g}", reading.start, reading.end)
    return Interval(low=max(interval.low, lowest), high=min(interval.high, highest))


def read_pH(passage: Passage, at: int, end: int) -> Reading | None:
    """The figure or range of a pH at ``at`` (after the word pH); None if there is none."""
    reading = read_quantity(passage, at, end, ("pH",), "a pH", signed=True)
    if reading is None:
        return None
    return Reading(_as_pH(passage, reading.interval, reading), "", reading.start, reading.end)


# More than any solution holds; a figure above it is a slip of the unit.
_MOST: dict[str, tuple[float, str]] = {
    "w/w": (1.0, "a strength by mass cannot be more than 100 %"),
    "v/v": (1.0, "a strength by volume cannot be more than 100 %"),
    "w/v": (4.0, "no solution holds more than 400 g in 100 mL; check the figure and the unit"),
    "g/L": (4000.0, "no solution holds more than 4000 g/L; check the figure and the unit"),
    "mol/L": (
        100.0,
        "no solution is stronger than 100 mol/L (water itself is 55 mol/L); check the figure and the unit",
    ),
    "eq/L": (200.0, "no solution is stronger than 200 eq/L; check the figure and the unit"),
    "mass ppm": (1e6, "a strength cannot be more than 1 000 000 ppm"),
}


def read_strength(passage: Passage, at: int, end: int, *, optional: bool = True) -> tuple[Strength, int, int] | None:
    """A strength in figures at ``at`` (``6 %``, ``10-50 g/L``, ``about 2 M``) with its start and end; None if none
    stands there.

    w/w, v/v and w/v come as fractions (g per mL for w/v). Raises InputError for impossible figures.
    """
    reading = read_quantity(passage, at, end, ("strength",), "a strength", optional=optional)
    if reading is None:
        return None
    most, message = _MOST[reading.unit]
    low, high = reading.interval.low, reading.interval.high
    if low > most * (1 + 1e-9):
        passage.fail(message, reading.start, reading.end)
    if high > most:
        stated = _QUALIFIER.match(passage.plain, at, end)
        if math.isfinite(high) and not (stated and stated["about"]):
            passage.fail(message, reading.start, reading.end)
        high = most if reading.unit in ("w/w", "v/v", "mass ppm") else high
    if high <= 0.0:
        passage.fail("a strength of zero says that nothing is there; leave it out", reading.start, reading.end)
    unit: StrengthUnit = reading.unit  # type: ignore[assignment]
    return Strength(unit=unit, value=Interval(low=low, high=high)), reading.start, reading.end
