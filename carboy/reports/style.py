"""How text is laid on a terminal: width, colour for signal words, plain ASCII for logs, wrapping."""

from __future__ import annotations

import os
import re
import shutil
import sys
import unicodedata
from collections.abc import Iterator
from typing import TextIO

from msgspec import Struct

from carboy.errors import CarboyError
from carboy.text.formulas import pretty_equation, pretty_formula

WIDEST = 92  # longer lines are hard to read at arm's length
_NARROWEST = 40
_PLAIN_WIDTH = 92  # signs grow a little in ASCII: no line of a log goes beyond 100
_KEPT = "\n\u00a0\u202f\u2009"  # blanks that isprintable() does not count

# what plain text writes for signs that ASCII lacks
_ASCII = {
    "→": "->", "←": "<-", "⇌": "<=>", "–": "-", "—": "-", "−": "-", "‑": "-", "·": ".", "×": "x", "µ": "u", "μ": "u", "°C": "degC",
    "°": "deg", "≤": "<=", "≥": ">=", "≈": "~", "…": "...", "’": "'", "‘": "'", "“": '"', "”": '"', "½": "1/2", "•": "-", "\u2009": " ",
    "\u202f": " ", "\u00a0": " ", "ₙ": "n", "Δ": "delta ",
}  # fmt: skip
_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻", "0123456789+-")
_BOXES = str.maketrans("─│┐┘┤├┬┴┼└┌", "-|+++++++++")
_ION = re.compile(r"(?<![\w+-])(?:[A-Z][a-z]?\d*|\((?:[A-Z][a-z]?\d*)+\)\d*)+[+-]\d?(?![\w+-])")
_SIGNS = {"degC": "°C", "m3": "m³"}
_UNIT = re.compile(r"(?<=[\d\s])(?:degC|m3)(?![\w])")
_POWER = re.compile("×10([⁰¹²³⁴⁵⁶⁷⁸⁹⁻]+)")


class Style(Struct, frozen=True):
    """How wide, with colour or not, with signs beyond ASCII or not."""

    width: int = 80
    colour: bool = False
    plain: bool = False

    def formula(self, token: str) -> str:
        """A species token with raised and lowered figures, or as the graph writes it if plain."""
        return token if self.plain else pretty_formula(token)

    def words(self, text: str) -> str:
        """A sentence in which ions are shown as formulas, and units with their signs."""
        if self.plain:
            return text
        return _UNIT.sub(lambda found: _SIGNS[found[0]], _ION.sub(lambda found: pretty_formula(found[0]), text))

    def equation(self, text: str) -> str:
        """An equation likewise; text that is no equation is given back."""
        if self.plain:
            return text
        try:
            return pretty_equation(text)
        except CarboyError:
            return text

    def strong(self, text: str) -> str:
        """Bold."""
        return f"\033[1m{text}\033[0m" if self.colour else text

    def alarm(self, text: str) -> str:
        """The one colour: bold, red."""
        return f"\033[1;31m{text}\033[0m" if self.colour else text

    def faint(self, text: str) -> str:
        """Dim, for what is looked at last."""
        return f"\033[2m{text}\033[0m" if self.colour else text

    def finished(self, text: str) -> str:
        """The whole output: without characters that could steer a terminal; as ASCII if plain."""
        kept = "".join(char for char in text if char.isprintable() or char in _KEPT or (self.colour and char == "\033"))
        return ascii_text(kept) if self.plain else kept


def style_for(stream: TextIO | None = None, *, plain: bool = False) -> Style:
    """The style for a stream: its width, no colour where it is no terminal or NO_COLOR is set, ASCII where it cannot show more."""
    stream = stream or sys.stdout
    terminal = stream.isatty()
    if plain:
        return Style(_PLAIN_WIDTH, colour=False, plain=True)
    columns = shutil.get_terminal_size((80, 24)).columns
    encoding = (getattr(stream, "encoding", None) or "ascii").lower().replace("-", "").replace("_", "")
    return Style(
        max(_NARROWEST, min(columns, WIDEST)),
        colour=terminal and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb",
        plain=not encoding.startswith("utf"),
    )


def ascii_text(text: str) -> str:
    """``text`` in ASCII: formulas without raised and lowered figures, arrows as ``->``; what has no ASCII form becomes ``?``."""
    if text.isascii():
        return text
    text = _POWER.sub(lambda found: "e" + found[1].translate(_SUPERSCRIPTS), text)
    for sign, plain in _ASCII.items():
        text = text.replace(sign, plain)
    text = text.translate(_BOXES).translate(_SUPERSCRIPTS)
    text = "".join(char for char in unicodedata.normalize("NFKD", text) if not unicodedata.combining(char))
    return "".join(char if char.isascii() else "?" for char in text)


def columns_of(text: str) -> int:
    """Columns that ``text`` takes on a terminal, escapes not counted."""
    total = 0
    escaped = False
    for char in text:
        if char == "\033":
            escaped = True
        elif escaped:
            escaped = char != "m"
        elif not unicodedata.combining(char):
            total += 2 if unicodedata.east_asian_width(char) in ("W", "F") else 1
    return total


def wrapped(text: str, width: int, first: str = "", rest: str | None = None) -> Iterator[str]:
    """The lines of ``text`` within ``width`` columns, led by ``first`` and then by ``rest`` (blanks as wide as ``first``).

    A word longer than a line stands on its own line, uncut, so that a name can be copied.
    """
    rest = " " * columns_of(first) if rest is None else rest
    line, fresh = first, True
    for word in text.split(" "):
        if not word:
            continue
        if not fresh and columns_of(line) + 1 + columns_of(word) > width:
            yield line.rstrip()
            line, fresh = rest, True
        line += word if fresh else f" {word}"
        fresh = False
    if not fresh or line.strip():
        yield line.rstrip()
