"""Units of volume, mass, amount, time, temperature, pressure, flow and strength; errors for words that are none.

Factors are those of the SI brochure (9th edition, 2019) and, for pound, ounce, gallon, psi and cubic foot, NIST Special
Publication 811 (2008), appendix B; from memory. A drop is 0.05 mL (common practice), a gallon is the US gallon, ``%``
alone is by mass, ``ppm`` is mg/kg.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from functools import cache
from typing import NoReturn

from msgspec import Struct

from carboy.errors import InputError
from carboy.model.plan import StrengthUnit
from carboy.text.figures import read_number
from carboy.text.passages import Passage, closest, skip_space


class Unit(Struct, frozen=True):
    """``(figure + shift) * factor`` is the figure in the canonical unit ``name``."""

    name: str
    factor: float
    shift: float = 0.0

    def canonical(self, figure: float) -> float:
        return (figure + self.shift) * self.factor


def _table(name: str, entries: dict[str, float]) -> dict[str, Unit]:
    return {word: Unit(name, factor) for words, factor in entries.items() for word in words.split("|")}


VOLUME = _table(
    "L",
    {
        "L|l|litre|litres|liter|liters|dm3|dm³": 1.0,
        "mL|ml|cc|cm3|cm³|ccm|millilitre|millilitres|milliliter|milliliters": 1e-3,
        "dL|dl": 0.1,
        "cL|cl": 1e-2,
        "µL|µl|uL|ul|microlitre|microlitres|microliter|microliters": 1e-6,
        "hL|hl": 100.0,
        "m3|m³|cubic metre|cubic metres|cubic meter|cubic meters": 1000.0,
        "ft3|ft³|cubic foot|cubic feet": 28.316846592,
        "gal|gallon|gallons|US gal|US gallon|US gallons": 3.785411784,
        "qt|quart|quarts": 0.946352946,
        "fl oz|fl. oz|fluid ounce|fluid ounces": 0.0295735295625,
        "drop|drops": 5e-5,
    },
)
MASS = _table(
    "g",
    {
        "g|gm|gram|grams|gramme|grammes": 1.0,
        "mg|milligram|milligrams": 1e-3,
        "µg|ug|mcg|microgram|micrograms": 1e-6,
        "ng|nanogram|nanograms": 1e-9,
        "kg|Kg|KG|kilo|kilos|kilogram|kilograms": 1000.0,
        "t|tonne|tonnes": 1e6,
        "lb|lbs|pound|pounds": 453.59237,
        "oz|ounce|ounces": 28.349523125,
    },
)
AMOUNT = _table(
    "mol",
    {
        "mol|mole|moles": 1.0,
        "mmol|millimole|millimoles": 1e-3,
        "µmol|umol|micromole|micromoles": 1e-6,
        "nmol": 1e-9,
        "kmol": 1000.0,
    },
)
EQUIVALENTS = _table("eq", {"eq|equiv|equivalent|equivalents": 1.0, "meq": 1e-3})
TIME = _table(
    "s",
    {
        "s|sec|secs|second|seconds": 1.0,
        "min|mins|minute|minutes": 60.0,
        "h|hr|hrs|hour|hours": 3600.0,
        "d|day|days": 86400.0,
        "wk|week|weeks": 604800.0,
    },
)
TEMPERATURE = {
    **_table("degC", {"degC|deg C|°C|° C|C|celsius|degrees C|degrees celsius|degree C": 1.0}),
    **{word: Unit("degC", 1.0, -273.15) for word in ("K", "kelvin")},
    **{word: Unit("degC", 5.0 / 9.0, -32.0) for word in ("degF", "deg F", "°F", "° F", "F", "fahrenheit", "degrees F")},
}
PRESSURE = _table(
    "kPa",
    {
        "kPa": 1.0,
        "Pa": 1e-3,
        "hPa|mbar|millibar": 0.1,
        "MPa": 1000.0,
        "bar|bars|barg|bar g": 100.0,
        "atm": 101.325,
        "psi|psig": 6.894757293168,
        "mmHg|torr|Torr": 0.1333223684210526,
    },
)

_PERCENT = r"(?:%|percent\b|per cent\b|pct\b)"
_KINDS: dict[str, StrengthUnit] = {
    "w/w": "w/w",
    "m/m": "w/w",
    "wt/wt": "w/w",
    "wt": "w/w",
    "w": "w/w",
    "by weight": "w/w",
    "by mass": "w/w",
    "weight": "w/w",
    "mass": "w/w",
    "w/v": "w/v",
    "m/v": "w/v",
    "wt/v": "w/v",
    "wt/vol": "w/v",
    "v/v": "v/v",
    "vol/vol": "v/v",
    "vol": "v/v",
    "by volume": "v/v",
    "volume": "v/v",
}
_KIND = "|".join(sorted(map(re.escape, _KINDS), key=len, reverse=True))
_PERCENT_AFTER = re.compile(
    rf"{_PERCENT}(?:\s*\(\s*(?P<enclosed>{_KIND})\s*\)|\s*(?P<kind>{_KIND})(?![\w/]))?", re.IGNORECASE
)
_PERCENT_BEFORE = re.compile(rf"(?P<kind>{_KIND})\.?[\s-]*%", re.IGNORECASE)
_SIMPLE_STRENGTHS: dict[str, tuple[StrengthUnit, float]] = {
    "M": ("mol/L", 1.0),
    "molar": ("mol/L", 1.0),
    "mM": ("mol/L", 1e-3),
    "millimolar": ("mol/L", 1e-3),
    "µM": ("mol/L", 1e-6),
    "uM": ("mol/L", 1e-6),
    "micromolar": ("mol/L", 1e-6),
    "nM": ("mol/L", 1e-9),
    "N": ("eq/L", 1.0),
    "normal": ("eq/L", 1.0),
    "mN": ("eq/L", 1e-3),
    "ppm": ("mass ppm", 1.0),
    "ppmw": ("mass ppm", 1.0),
    "mg/kg": ("mass ppm", 1.0),
    "g/kg": ("mass ppm", 1000.0),
    "µg/kg": ("mass ppm", 1e-3),
    "ug/kg": ("mass ppm", 1e-3),
    "ppb": ("mass ppm", 1e-3),
    "‰": ("w/w", 1e-3),
}
# Words that look like strengths and are refused with a reason.
_REFUSED_STRENGTHS = {
    "m": "'m' is molal (mol per kg of solvent), which is not read; give mol/L (M), g/L or %",
    "molal": "molal (mol per kg of solvent) is not read; give mol/L (M), g/L or %",
    "mol/kg": "mol per kg is not read; give mol/L (M), g/L or %",
    "mol%": "mole per cent is not read; give mol/L (M), g/L or %",
    "mol %": "mole per cent is not read; give mol/L (M), g/L or %",
    "ppt": "'ppt' is read as parts per thousand by some and per trillion by others; give mg/L or %",
}
# Dimensions that are none of ours, so that the error can say what the word is.
_FOREIGN = {
    "a length": ("mm", "cm", "m", "km", "nm", "µm", "um", "in", "inch", "inches", "ft", "foot", "feet"),
    "an area": ("m2", "cm2", "mm2", "m²", "cm²"),
    "an energy": ("J", "kJ", "cal", "kcal"),
    "a power": ("W", "kW"),
    "a voltage": ("V", "mV"),
    "a radioactivity": ("Bq", "MBq", "Ci", "mCi"),
    "an activity of an enzyme": ("U", "IU"),
}
_WORDS_OF: dict[str, dict[str, Unit]] = {
    "volume": VOLUME,
    "mass": MASS,
    "amount": AMOUNT,
    "time": TIME,
    "temperature": TEMPERATURE,
    "pressure": PRESSURE,
}
NAMES_OF = {
    "volume": "a volume",
    "mass": "a mass",
    "amount": "an amount in mol",
    "time": "a time",
    "temperature": "a temperature",
    "pressure": "a pressure",
    "flow": "a flow",
    "air changes": "a rate of air changes",
    "pH": "a pH",
    "share": "a share",
}
_COMMON = {
    "volume": ("mL", "L"),
    "mass": ("g", "mg", "kg"),
    "amount": ("mol", "mmol"),
    "time": ("s", "min", "h", "d"),
    "temperature": ("degC", "K", "degF"),
    "pressure": ("kPa", "bar", "psi"),
    "flow": ("m3/s", "m3/h", "L/min", "cfm"),
    "strength": ("M", "mM", "N", "%", "g/L", "mg/L", "ppm"),
}


def _pattern(words: Iterable[str], *, whole: bool = True) -> re.Pattern[str]:
    """Any of the words, where ``whole`` with nothing of a word after it.

    Longest first; a word of four letters or more in any case, since it cannot be taken for another unit.
    """
    parts = []
    for word in sorted(words, key=len, reverse=True):
        escaped = re.escape(word)
        parts.append(f"(?i:{escaped})" if len(word) >= 4 and word.isalpha() else escaped)
    return re.compile(rf"(?:{'|'.join(parts)}){_UNIT_ENDS if whole else ''}")


_UNIT_ENDS = r"(?![\w³²µ°%/^⁻]|-[A-Za-z])\.?(?!\w)"


@cache
def _pattern_of(dimension: str, *, whole: bool = True) -> re.Pattern[str]:
    """The pattern of a dimension's words; made when first needed, since most runs need few of them."""
    return _pattern(EQUIVALENTS if dimension == "equivalents" else _WORDS_OF[dimension], whole=whole)


@cache
def _strength_pattern(*, refused: bool) -> re.Pattern[str]:
    return _pattern(_REFUSED_STRENGTHS if refused else _SIMPLE_STRENGTHS)


def _lookup(table: dict[str, Unit], word: str) -> Unit:
    word = word.rstrip(".")
    if word in table:
        return table[word]
    return (
        table[word.casefold()]
        if word.casefold() in table
        else {k.casefold(): v for k, v in table.items()}[word.casefold()]
    )


def read_unit(passage: Passage, at: int, end: int, dimension: str) -> tuple[Unit, int] | None:
    """The unit of ``dimension`` at ``at`` and where it ends; None if the word there is none."""
    at = skip_space(passage.plain, at, end)
    if dimension == "flow":
        return _read_flow(passage, at, end)
    if dimension == "air changes":
        found = re.compile(
            r"(?:/\s*h|/\s*hour|per\s+hour|h-1|h\^-1|h⁻¹|1/h|ACH|ach|air changes(?: per hour|/h)?)(?!\w)"
        ).match(passage.plain, at, end)
        return (Unit("1/h", 1.0), found.end()) if found else (Unit("1/h", 1.0), at)
    if dimension == "pH":
        return Unit("", 1.0), at
    if dimension == "share":
        found = re.compile(r"%|percent\b|per cent\b").match(passage.plain, at, end)
        return (Unit("", 0.01), found.end()) if found else (Unit("", 1.0), at)
    found = _pattern_of(dimension).match(passage.plain, at, end)
    if found is None:
        return None
    return _lookup(_WORDS_OF[dimension], found.group()), found.end()


def _part(passage: Passage, at: int, end: int, dimension: str) -> tuple[Unit, int] | None:
    """A unit that may be followed by ``/``, ``-1`` and the like."""
    table = EQUIVALENTS if dimension == "equivalents" else _WORDS_OF[dimension]
    found = _pattern_of(dimension, whole=False).match(passage.plain, at, end)
    if found is None:
        return None
    return _lookup(table, found.group()), found.end()


_SLASH = re.compile(r"\s*/\s*|\s+per\s+")
_TIMES = re.compile(r"\s*[·*]\s*|\s+")
_INVERSE = re.compile(r"\s*(?:\^?\s*\(?-1\)?|⁻¹)(?!\d)")
_ENDS = re.compile(r"(?![\w³²µ°/^⁻])")


def _read_ratio(passage: Passage, at: int, end: int, upper: str, lower: str) -> tuple[Unit, Unit, float, int] | None:
    """``g/L``, ``g per L``, ``g L-1``, ``g/100 mL``: the units above and below, the figure below, and the end."""
    above = _part(passage, at, end, upper)
    if above is None:
        return None
    unit, where = above
    found = _SLASH.match(passage.plain, where, end)
    if found:
        where, figure = found.end(), 1.0
        number = read_number(passage, where, end)
        if number:
            figure, where = number[0], skip_space(passage.plain, number[2], end)
        below = _part(passage, where, end, lower)
        if below is None or figure <= 0.0 or not _ENDS.match(passage.plain, below[1], end):
            return None
        return unit, below[0], figure, below[1]
    found = _TIMES.match(passage.plain, where, end)
    if found:
        below = _part(passage, found.end(), end, lower)
        inverse = _INVERSE.match(passage.plain, below[1], end) if below else None
        if below and inverse:
            return unit, below[0], 1.0, inverse.end()
    return None


def _read_flow(passage: Passage, at: int, end: int) -> tuple[Unit, int] | None:
    found = re.compile(r"(?:cfm|CFM|ft3/min)(?!\w)").match(passage.plain, at, end)
    if found:
        return Unit("m3/s", 0.028316846592 / 60.0), found.end()
    ratio = _read_ratio(passage, at, end, "volume", "time")
    if ratio is None:
        return None
    above, below, figure, where = ratio
    return Unit("m3/s", above.factor * 1e-3 / (below.factor * figure)), where


def read_strength_unit(passage: Passage, at: int, end: int) -> tuple[Unit, int] | None:
    """The strength unit at ``at`` as a Unit whose name is a StrengthUnit of the plan; None if the word there is none.

    Raises InputError for a unit that is understood and refused (molal, mole per cent, ppt).
    """
    at = skip_space(passage.plain, at, end)
    text = passage.plain
    if found := _PERCENT_AFTER.match(text, at, end):
        kind = (found["enclosed"] or found["kind"] or "w/w").lower()
        return Unit(_KINDS[kind], 0.01), found.end()
    if found := _PERCENT_BEFORE.match(text, at, end):
        return Unit(_KINDS[found["kind"].lower()], 0.01), found.end()
    for upper, name in (("mass", "g/L"), ("amount", "mol/L"), ("equivalents", "eq/L")):
        ratio = _read_ratio(passage, at, end, upper, "volume")
        if ratio:
            above, below, figure, where = ratio
            return Unit(name, above.factor / (below.factor * figure)), where
    if found := _strength_pattern(refused=False).match(text, at, end):
        word = found.group().rstrip(".")
        unit, factor = _SIMPLE_STRENGTHS.get(word) or _SIMPLE_STRENGTHS[word.casefold()]
        # "N,N-dimethyl..." and "M-..." begin a name, they are no unit
        if not re.compile(r",\s?[A-Z]|-\w").match(text, found.end(), end):
            return Unit(unit, factor), found.end()
    found = _strength_pattern(refused=True).match(text, at, end)
    if found and not re.compile(r"-\w").match(text, found.end(), end):
        passage.fail(_REFUSED_STRENGTHS[found.group().rstrip(".")], at, found.end())
    return None


def refuse_unit(passage: Passage, at: int, end: int, wanted: Sequence[str], what: str) -> NoReturn:
    """Raise the error for a word that should have been a unit of one of ``wanted`` (dimensions, or ``strength``)."""
    start, stop = passage.word(at, end)
    known = [word for name in wanted for word in (_COMMON.get(name) or ())]
    if start >= stop:
        passage.fail(
            f"a unit is missing after this number; {what} needs one, such as {_list(known[:4])}", max(0, at - 1), at
        )
    word = passage.plain[start:stop]
    meant = _dimension_of(passage, start, stop)
    full = [entry for name in wanted for entry in (*_WORDS_OF.get(name, {}), *(_COMMON.get(name) or ()))]
    if "strength" in wanted:
        full += [*_SIMPLE_STRENGTHS]
    usual = tuple(near for name in wanted for near in closest(word, _COMMON.get(name) or (), 1, cutoff=50.0))
    suggestions = (*usual, *(other for other in closest(word, full, cutoff=60.0) if other not in usual))[:3]
    if meant:
        passage.fail(f"'{word}' is {meant}, which is not {what}", start, stop, suggestions)
    passage.fail(
        f"'{word}' is not a unit of {what.removeprefix('an ').removeprefix('a ')} that is known here",
        start,
        stop,
        suggestions,
    )


def _dimension_of(passage: Passage, start: int, stop: int) -> str:
    word = passage.plain[start:stop]
    for dimension in ("volume", "mass", "amount", "flow", "time", "temperature", "pressure"):
        found = read_unit(passage, start, stop, dimension)
        if found and found[1] == stop:
            return NAMES_OF[dimension]
    for name, words in _FOREIGN.items():
        if word in words:
            return name
    try:
        strength = read_strength_unit(passage, start, stop)
    except InputError:
        return "a strength"
    return "a strength" if strength and strength[1] == stop else ""


def unit_word(passage: Passage, at: int, end: int) -> bool:
    """Whether the word at ``at`` is a unit of any dimension, ours or another."""
    start, stop = passage.word(at, end)
    return bool(start < stop and _dimension_of(passage, start, stop))


def _list(words: Sequence[str]) -> str:
    return " or ".join((", ".join(words[:-1]), words[-1])) if len(words) > 1 else "".join(words)
