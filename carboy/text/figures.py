"""Figures as people write them: ``1 000``, ``1,000``, ``0,5``, ``1.5e-3``, ``2 x 10^-3``, ``1/2``, ``1½``."""

from __future__ import annotations

import math
import re

from carboy.text.passages import Passage, skip_space

_GROUPS = r"\d{1,3}(?:[ ']\d{3})+(?!\d)(?:[.,]\d+)?"
_COMMAS = r"[1-9]\d{0,2}(?:,\d{3})+(?![\d,])(?:\.\d+)?"
_POINTS = r"[1-9]\d{0,2}(?:\.\d{3})+,\d+"
_PLAIN = r"\d+[.,]\d+|\d+|\.\d+"
_RAISED = "⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺"
_LOWERED = str.maketrans(_RAISED, "0123456789-+")
_POWER = rf"(?:\s*(?:\^|\*\*)\s*[+-]?\d+|[+-]\d+|[{_RAISED}]+)"
_VULGAR = {"½": 1 / 2, "¼": 1 / 4, "¾": 3 / 4, "⅓": 1 / 3, "⅔": 2 / 3, "⅛": 1 / 8, "⅜": 3 / 8, "⅝": 5 / 8, "⅞": 7 / 8}
_NUMBER = re.compile(
    rf"""(?P<sign>[+-]?)(?:
        (?P<power>10(?:\s*(?:\^|\*\*)\s*[+-]?\d+|[{_RAISED}]+))
      | (?:(?P<whole>\d+)\s+)?(?P<over>\d+)/(?P<under>\d+)(?![\d/])
      | (?P<before>\d*)\s?(?P<vulgar>[{"".join(_VULGAR)}])
      | (?P<digits>{_GROUPS}|{_POINTS}|{_COMMAS}|{_PLAIN})
        (?: [eE](?P<exponent>[+-]?\d+)(?!\w) | \s*[x×*·]\s*10(?P<times>{_POWER}) )?
    )""",
    re.VERBOSE,
)


def read_number(passage: Passage, at: int, end: int | None = None) -> tuple[float, int, int] | None:
    """The number at ``at`` (white space before it is skipped) as value, start and end; None if there is none.

    A comma with exactly three digits after it groups thousands (``1,000``) unless the number begins with 0 (``0,500``).
    """
    end = len(passage.plain) if end is None else end
    at = skip_space(passage.plain, at, end)
    found = _NUMBER.match(passage.plain, at, end)
    if found is None:
        return None
    part = found.groupdict()
    if part["power"]:
        value = _ten_to(part["power"][2:])
    elif part["over"]:
        if len(part["over"]) > 15 or len(part["under"]) > 15 or float(part["under"]) == 0.0:
            passage.fail("this fraction cannot be read as a number", found.start(), found.end())
        value = float(part["whole"] or 0) + float(part["over"]) / float(part["under"])
    elif part["vulgar"]:
        value = float(part["before"] or 0) + _VULGAR[part["vulgar"]]
    else:
        value = _decimal(part["digits"])
        if part["exponent"]:
            value = _scaled(value, part["exponent"])
        elif part["times"]:
            value *= _ten_to(part["times"])
    if not math.isfinite(value) or value > 1e30:
        passage.fail("this number is too large to be meant", found.start(), found.end())
    return (-value if part["sign"] == "-" else value), found.start(), found.end()


def _decimal(digits: str) -> float:
    digits = re.sub(r"[ ']", "", digits)
    if re.fullmatch(_POINTS, digits):
        return float(digits.replace(".", "").replace(",", "."))
    if re.fullmatch(_COMMAS, digits):
        return float(digits.replace(",", ""))
    return float(digits.replace(",", "."))


def _scaled(value: float, exponent: str) -> float:
    return value * 10.0 ** int(exponent) if len(exponent) < 5 and abs(int(exponent)) <= 300 else math.inf


def _ten_to(words: str) -> float:
    exponent = re.sub(r"[\s^*]", "", words).translate(_LOWERED)
    return _scaled(1.0, exponent) if re.fullmatch(r"[+-]?\d+", exponent) else math.inf
