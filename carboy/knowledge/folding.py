"""Folding of names: what may differ between two spellings of one name is taken out, what tells two things apart is
kept.

Taken out: case, spaces, hyphens, apostrophes, Unicode forms, British or American spelling. Kept: every letter that
carries chemistry (sulfide, sulfite) and oxidation numbers (``mercury(II)``).
"""

from __future__ import annotations

import re
import unicodedata

_GREEK = str.maketrans(
    {"α": "alpha", "β": "beta", "γ": "gamma", "δ": "delta", "ε": "epsilon", "ω": "omega", "λ": "lambda"}
)
_DASHES = str.maketrans(dict.fromkeys("‐‑‒–—−", "-"))
_ROMAN = {1: "i", 2: "ii", 3: "iii", 4: "iv", 5: "v", 6: "vi", 7: "vii", 8: "viii"}
_NUMERAL = r"(?:viii|vii|vi|iv|v|iii|ii|i|0)"
_IN_BRACKETS = re.compile(rf"\(\s*({_NUMERAL}(?:\s*,\s*{_NUMERAL})*)\s*\)")
_IN_WORDS = re.compile(rf"(?<=[a-z])[\s-]+({_NUMERAL})(?=[\s-]|$)")
_AS_CHARGE = re.compile(r"\(\s*([1-8])\s*\+\s*\)")
# spelling: British forms to the ones that most labels have
_SPELLINGS = (
    (re.compile(r"['’‘´`]s\b"), ""),  # Fehling's solution is Fehling solution
    (re.compile("sulph"), "sulf"),
    (re.compile("aluminium"), "aluminum"),
    (re.compile("caesium"), "cesium"),
    (re.compile(r"is(ed|er|ers|ing|ation)\b"), r"iz\1"),
    (re.compile(r"colour"), "color"),
    (re.compile(r"odour"), "odor"),
)
_DROPPED = re.compile(r"[\s\-'’‘´`\"“”._/:;()\[\]{}]|,(?!\d)|(?<!\d),")


def fold(name: str) -> str:
    """The folded form of a name: ``Mercury (ii) Nitrate`` and ``mercury-II-nitrate`` give ``mercury<ii>nitrate``.

    Two names are taken for one only if their folded forms are equal. Idempotent only up to the marks ``<`` and ``>``.
    """
    text = unicodedata.normalize("NFKC", name).casefold().translate(_GREEK).translate(_DASHES)
    text = "".join(char for char in unicodedata.normalize("NFKD", text) if not unicodedata.combining(char))
    text = _AS_CHARGE.sub(lambda match: f"<{_ROMAN[int(match.group(1))]}>", text)
    text = _IN_BRACKETS.sub(lambda match: "<" + re.sub(r"\s*,\s*", "&", match.group(1)) + ">", text)
    text = _IN_WORDS.sub(r"<\1>", text)
    for pattern, replacement in _SPELLINGS:
        text = pattern.sub(replacement, text)
    return _DROPPED.sub("", text)
