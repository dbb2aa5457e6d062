"""A piece of text that knows where it came from, and the words most like a misspelt one."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from typing import NoReturn

from carboy.errors import InputError
from carboy.span import Span

# Characters that stand for another one; each is one for one, so that places in the text stay where they are.
_SAME = str.maketrans(
    {
        "\u03bc": "\u00b5",  # Greek mu for the micro sign
        "\u00a0": " ",
        "\u2009": " ",
        "\u202f": " ",
        "\u2007": " ",
        "\t": " ",
        "\n": " ",
        "\r": " ",
        "\u2212": "-",
        "\u2010": "-",
        "\u2011": "-",
        "\u2012": "-",
        "\u2013": "-",
        "\u2014": "-",
        "\u2019": "'",
        "\u2032": "'",
        "\u223c": "~",
        "\u2248": "~",
        "\u22c5": "\u00b7",
        "\u2022": "\u00b7",
    }
)

_WORD = re.compile(r"\s*([^\s,;()]+|[,;()])")


@dataclass(frozen=True)
class Passage:
    """A piece of text and where it came from, so that a place in it can be shown in its file.

    ``within`` is the whole text of the file and ``positions[i]`` the place there of character ``i`` (one more for the
    end); without them the passage is its own text.
    """

    text: str
    file: str = ""
    within: str | None = None
    positions: Sequence[int] | None = None
    plain: str = field(init=False, repr=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "plain", self.text.translate(_SAME))

    def span(self, start: int, end: int) -> Span:
        """The place of characters ``start`` to ``end``; a place past the end is the last character's."""
        size = len(self.text)
        start, end = min(max(start, 0), size), min(max(end, 0), size)
        if self.within is None or self.positions is None:
            return Span(self.text, start, max(start, end), self.file)
        first = self.positions[start]
        last = self.positions[end - 1] + 1 if end > start else first
        return Span(self.within, first, max(first, last), self.file)

    def with_plain(self, plain: str) -> Passage:
        """The same passage with other characters to read (as many as before) and the same places."""
        other = Passage(self.text, self.file, self.within, self.positions)
        object.__setattr__(other, "plain", plain)
        return other

    def fail(self, message: str, start: int, end: int, suggestions: Iterable[str] = ()) -> NoReturn:
        """Raise the InputError for a place in this passage."""
        raise InputError(message, span=self.span(start, end), suggestions=tuple(suggestions))

    def word(self, at: int, end: int | None = None) -> tuple[int, int]:
        """Start and end of the word at or after ``at`` (empty at the end of the text)."""
        end = len(self.plain) if end is None else end
        found = _WORD.match(self.plain, at, end)
        return (found.start(1), found.end(1)) if found else (end, end)


def passage_of(text: str | Passage, file: str = "") -> Passage:
    """``text`` as a passage."""
    return text if isinstance(text, Passage) else Passage(text, file)


def closest(word: str, known: Iterable[str], count: int = 3, cutoff: float = 60.0) -> tuple[str, ...]:
    """The words of ``known`` most like ``word``, best first."""
    from rapidfuzz import fuzz, process

    folded: dict[str, str] = {}
    for entry in known:
        folded.setdefault(entry.casefold(), entry)
    found = process.extract(word.casefold(), list(folded), scorer=fuzz.ratio, limit=count, score_cutoff=cutoff)
    return tuple(folded[entry] for entry, _, _ in found)


def skip_space(text: str, at: int, end: int) -> int:
    """The first place from ``at`` on that is no white space, or ``end``."""
    while at < end and text[at].isspace():
        at += 1
    return at
