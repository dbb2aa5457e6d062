"""CAS registry numbers: form and check digit."""

from __future__ import annotations

import re

_FORM = re.compile(r"(?P<body>\d{2,7}-\d{2})-(?P<check>\d)")


def has_cas_form(text: str) -> bool:
    """Whether ``text`` is written like a CAS number: 2 to 7 digits, 2 digits, 1 digit."""
    return _FORM.fullmatch(text) is not None


def check_digit_fits(number: str) -> bool:
    """Whether the last digit is the sum of the others, each weighted by its place from the right, modulo 10."""
    match = _FORM.fullmatch(number)
    if match is None:
        return False
    digits = match["body"].replace("-", "")
    return sum(place * int(digit) for place, digit in enumerate(reversed(digits), start=1)) % 10 == int(match["check"])
