"""What stands on a label, as a Portion: ``4 L of (10-50 g/L copper sulfate + 0.5 M sulfuric acid in water)``.

::

    portion   = amount ["of"] ( solution | item ) [", pH" figures]
    solution  = "(" item { "+" item } ")" ["in" solvent]
    item      = { strength | "aqueous" | form } name { form | "solution" | strength } ["in" solvent]
    strength  = figures unit | "concentrated" | "dilute" | "saturated" | "trace of" | "unknown strength"
    name      = any name or formula known to the graph | "CAS" number | "SMILES" string | "unknown" words

Read by hand and not by a grammar, because a name may hold digits, commas, parentheses and plus signs, so that the
longest run of words that is known as a name wins over every other reading. What cannot be placed is an error at its
place; what reads like a name but is not known is carried on as ``unrecognised``.

``in`` followed by a strength names a second ingredient in water (``0.02 M mercury(II) nitrate in 0.4 M nitric acid``).
An item of a solution with no strength of its own, and a substance called a solution without one, have the strength
``unknown``.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from typing import Literal, NoReturn, Protocol

from msgspec import Struct

from carboy.errors import InputError
from carboy.model.plan import Ingredient, Interval, Portion, Strength, StrengthUnit
from carboy.text.figures import read_number
from carboy.text.passages import Passage, closest, passage_of
from carboy.text.quantities import (
    UNKNOWN,
    begins_quantity,
    read_pH,
    read_quantity,
    read_strength,
)
from carboy.text.units import read_strength_unit, read_unit, refuse_unit, unit_word


class NameMatch(Protocol):
    """What a name was found to mean.

    ``kind`` is "substance", "material", "salt" (of known ions; ``id`` is their sum) or another; ``extra_water`` the water of
    crystallisation beyond that of the
    thing (mol per mol); ``dropped`` the words that were passed over to find it ("powder", "solution").
    """

    @property
    def kind(self) -> str: ...

    @property
    def id(self) -> str: ...

    @property
    def extra_water(self) -> float: ...

    @property
    def dropped(self) -> tuple[str, ...]: ...


class NameLookup(Protocol):
    """The names that the graph knows."""

    def resolve(self, text: str) -> NameMatch:
        """The thing of this name, formula or CAS number; of another kind than substance, material and salt if there is
        none.
        """

    def suggest(self, text: str, n: int = 3) -> Sequence[str]:
        """Known names like ``text``, best first."""

    def container(self, text: str) -> str | None:
        """Id of a container material."""

    def report_keys(self, text: str) -> tuple[str, ...]:
        """Keys of the report that an element, ion or class covers."""

    def chemical_class(self, text: str) -> str | None:
        """Key of a chemical class; None if there is none of this name."""

    def published_limits(self, text: str) -> dict[str, dict[str, float]]:
        """Kind of limit -> mg/L by report key, of the published limits that ``text`` names; {} if none."""

    def no_longer_seen(self) -> float:
        """mol/L below which test papers and strips no longer show a thing."""


AMOUNT_DIMENSIONS = ("volume", "mass", "amount")
_MOST_OF: dict[str, float] = {"L": 1e5, "g": 1e8, "mol": 1e7}
_LONGEST = 2000  # characters; a label is shorter

_FORMS = {
    "powder": ("powder", "powdered", "powders"),
    "dust": ("dust",),
    "turnings": ("turnings",),
    "shavings": ("shavings",),
    "filings": ("filings",),
    "pellets": ("pellets", "pellet"),
    "granules": ("granules", "granular", "granulated"),
    "flakes": ("flakes",),
    "beads": ("beads",),
    "chips": ("chips",),
    "lumps": ("lumps", "lump"),
    "crystals": ("crystals", "crystalline"),
    "wire": ("wire",),
    "foil": ("foil",),
    "ribbon": ("ribbon",),
    "sheet": ("sheet",),
    "wool": ("wool",),
    "solid": ("solid", "(s)"),
    "liquid": ("liquid", "(l)"),
    "gas": ("gas", "gaseous", "(g)"),
    "solution": ("solution", "soln", "soln.", "solutions", "aqueous", "aq", "aq.", "(aq)", "(aq.)"),
}
_FORM_OF = {word: form for form, words in _FORMS.items() for word in words}
_STRENGTH_WORDS: dict[str, StrengthUnit] = {
    "concentrated": "concentrated",
    "conc": "concentrated",
    "conc.": "concentrated",
    "dilute": "dilute",
    "diluted": "dilute",
    "dil": "dilute",
    "dil.": "dilute",
    "saturated": "saturated",
    "sat": "saturated",
    "sat.": "saturated",
    "satd": "saturated",
    "satd.": "saturated",
    "sat'd": "saturated",
    "neat": "neat",
    "pure": "neat",
    "undiluted": "neat",
}
_STRENGTH_PHRASES: tuple[tuple[re.Pattern[str], StrengthUnit], ...] = (
    (re.compile(r"(?:a\s+)?traces?(?:\s+amounts?)?\s+(?:of\s+)?(?=\S)", re.IGNORECASE), "trace"),
    (re.compile(r"unknown\s+(?:strength|concentration)(?:\s+of)?\s+(?=\S)", re.IGNORECASE), "unknown"),
)
_TRAILING_UNKNOWN = re.compile(r",?\s+(?:of|in|at)\s+(?:an?\s+)?unknown\s+(?:strength|concentration)$", re.IGNORECASE)
_UNKNOWN_THING = re.compile(r"(?:an?\s+)?(?:unknown|unidentified|unlabel+ed)\b", re.IGNORECASE)
_UNKNOWN_AMOUNT = re.compile(
    r"(?:an?\s+)?unknown\s+(?P<of>amount|quantity|volume|mass|weight)\s+(?:of\s+)?(?=\S)", re.IGNORECASE
)
_CAS = re.compile(
    r"CAS(?:[\s-]*(?:RN|no\.?|nr\.?|number|registry number))?\s*[:#]?\s*(?P<number>[\d-]\S*)", re.IGNORECASE
)
_CAS_NUMBER = re.compile(r"\d{2,7}-\d\d-\d")
_SMILES = re.compile(r"SMILES\s*[:=]?\s*(?P<string>\S+)", re.IGNORECASE)
_SMILES_CHARACTERS = re.compile(r"[A-Za-z0-9@+\-\[\]()=#$/\\%.:*~>]")
_OF = re.compile(r"\s*of(?![\w-])\s*(?:an?\s+(?=\S))?", re.IGNORECASE)
_IN = re.compile(r"\s+in\s+", re.IGNORECASE)
_PH = re.compile(r"(?<![\w])pH(?![a-z])\s*(?:of\s+|is\s+|=\s*|:\s*)?", re.IGNORECASE)
_RATIO = re.compile(r"\d+(?:\.\d+)?\s*:\s*\d+(?:\.\d+)?(?!\S)")
# Words that no name holds by itself: one that is left over means that the text says more than a portion can hold.
_STRAY = (
    "from",
    "for",
    "with",
    "without",
    "to",
    "at",
    "the",
    "or",
    "into",
    "some",
    "my",
    "our",
    "containing",
    "plus",
    "than",
    "then",
    "about",
    "approximately",
    "roughly",
    "circa",
    "up",
    "least",
    "most",
    "as",
    "under",
)
_WATER = "substance:water"


class _Item(Struct):
    """One ingredient as read, and the solvent if it was said with it."""

    ingredient: Ingredient
    form: str = ""
    solvent: str = ""
    solvent_words: str = ""
    more: tuple[Ingredient, ...] = ()  # of the solvent, where that is itself a solution
    start: int = 0
    end: int = 0


def parse_portion(
    text: str | Passage,
    names: NameLookup,
    *,
    file: str = "",
    within: str | None = None,
    offset: int = 0,
) -> Portion:
    """The portion that ``text`` describes.

    ``names`` knows the graph's names. ``file`` and ``within`` (its whole text, in which ``text`` begins at ``offset``)
    are for the places in errors; a :class:`Passage` brings its own. Volumes come in L, masses in g. Raises InputError.
    """
    if isinstance(text, str) and within is not None:
        passage = Passage(text, file, within, range(offset, offset + len(text) + 1))
    else:
        passage = passage_of(text, file)
    return _Reader(passage, names).portion()


class _Reader:
    """Reads one passage; all places are indices into it."""

    def __init__(self, passage: Passage, names: NameLookup) -> None:
        self.passage = passage
        self.names = names
        self.text = passage.plain
        self.found: dict[str, NameMatch | None] = {}

    # -- helpers

    def fail(self, message: str, start: int, end: int, suggestions: Sequence[str] = ()) -> NoReturn:
        self.passage.fail(message, start, end, suggestions)

    def trim(self, start: int, end: int, also: str = "") -> tuple[int, int]:
        while start < end and (self.text[start].isspace() or self.text[start] in also):
            start += 1
        while end > start and (self.text[end - 1].isspace() or self.text[end - 1] in also):
            end -= 1
        return start, end

    def said(self, start: int, end: int) -> str:
        return self.passage.text[start:end]

    def resolve(self, start: int, end: int, *, loosely: bool = False) -> NameMatch | None:
        """The substance or material named by exactly these characters; ``loosely``: some words may be passed over."""
        words = " ".join(self.text[start:end].split())
        if not words:
            return None
        if words not in self.found:
            try:
                match = self.names.resolve(words)
            except InputError:  # a number or formula that is wrong is no known name
                self.found[words] = None
            else:
                self.found[words] = match if match.kind in ("substance", "material", "salt") else None
        found = self.found[words]
        return found if found is not None and (loosely or not found.dropped) else None

    def blank(self, start: int, end: int) -> None:
        self.text = self.text[:start] + " " * (end - start) + self.text[end:]
        self.passage = self.passage.with_plain(self.text)

    # -- the portion

    def portion(self) -> Portion:
        start, end = self.trim(0, len(self.text))
        if start == end:
            self.fail("a portion is missing here, such as '500 mL of acetone'", start, end)
        if end - start > _LONGEST:
            self.fail(f"this is longer than any label ({_LONGEST} characters)", start, start + 20)
        for place in range(start, end):
            if not self.text[place].isprintable():
                self.fail("this character cannot stand in a portion", place, place + 1)
        amount, unit, where = self.amount(start, end)
        if found := _OF.match(self.text, where, end):
            where = found.end()
        start, end = self.trim(where, end, ",")
        last = self.text[start:end].split()[-1:]
        full_stop = end - start > 2 and self.text[end - 1] == "." and self.text[end - 2].islower()
        if full_stop and last[0] not in _STRENGTH_WORDS and last[0] not in _FORM_OF and not self.resolve(start, end):
            end -= 1
        if start >= end:
            self.fail("the amount is here, but not of what", *self.passage.word(0))
        self.check_second_amount(start, end)
        pH, start, end = self.take_pH(start, end)
        self.check_brackets(start, end)
        items, tail = self.items(start, end)
        dissolved = len(items) > 1 or items[0].solvent or items[0].ingredient.strength.unit != "neat"
        if unit == "mol" and dissolved:
            self.fail(
                "an amount in mol is of a pure substance; give a solution in mL or g",
                self.trim(0, where)[0],
                self.trim(0, where)[1],
            )
        return self.assemble(amount, unit, items, tail, pH)

    def amount(self, start: int, end: int) -> tuple[Interval, Literal["L", "g", "mol"], int]:
        if found := _UNKNOWN_AMOUNT.match(self.text, start, end):
            kind = found["of"].lower()
            return UNKNOWN, "L" if kind == "volume" else "g" if kind in ("mass", "weight") else "mol", found.end()
        reading = read_quantity(self.passage, start, end, AMOUNT_DIMENSIONS, "an amount", optional=True)
        if reading is None and begins_quantity(self.passage, start, end):
            if self.quietly_strength(start, end):
                at, stop = self.passage.word(start, end)
                self.fail("this is a strength; an amount is needed before it, such as '500 mL of 2 M ...'", at, stop)
            read_quantity(self.passage, start, end, AMOUNT_DIMENSIONS, "an amount")
        if reading is None:
            at, stop = self.passage.word(start, end)
            if _UNKNOWN_THING.match(self.text, start, end):
                self.fail(
                    "an amount is needed even of an unknown, such as '1 L of unknown' or 'unknown volume of ...'",
                    at,
                    stop,
                )
            self.fail("an amount is needed first, such as '500 mL of acetone' or '5 g of zinc powder'", at, stop)
        unit: Literal["L", "g", "mol"] = reading.unit  # type: ignore[assignment]
        low, high = reading.interval.low, reading.interval.high
        if high <= 0.0:
            self.fail("an amount of zero adds nothing; leave this portion out", reading.start, reading.end)
        if low > _MOST_OF[unit] or (math.isfinite(high) and high > _MOST_OF[unit]):
            self.fail(
                "this is more than any vessel here holds; check the figure and the unit", reading.start, reading.end
            )
        return reading.interval, unit, reading.end

    def check_second_amount(self, start: int, end: int) -> None:
        """``10 mL mL of water`` and ``10 mL 20 mL of water``."""
        if self.resolve(start, end):
            return
        for dimension in AMOUNT_DIMENSIONS:
            unit = read_unit(self.passage, start, end, dimension)
            if unit and (unit[1] == end or self.text[unit[1]].isspace()):
                self.fail("the unit is given twice", start, unit[1])
        number = read_number(self.passage, start, end)
        if number:
            for dimension in AMOUNT_DIMENSIONS:
                unit = read_unit(self.passage, number[2], end, dimension)
                strength = self.quietly_strength(start, end)
                if unit and not strength and (unit[1] == end or self.text[unit[1]].isspace()):
                    self.fail("the amount is given twice; one portion has one amount", start, unit[1])

    def quietly_strength(self, start: int, end: int) -> bool:
        """Whether a strength in figures (good or impossible) stands at ``start``."""
        try:
            return read_strength(self.passage, start, end) is not None
        except InputError:
            return True

    def take_pH(self, start: int, end: int) -> tuple[Interval | None, int, int]:
        """Take ``pH ...`` out of the text; what is left of the portion is between the two places that come back."""
        if self.resolve(start, end):
            return None, start, end
        found = _PH.search(self.text, start, end)
        if found is None:
            return None, start, end
        if unknown := re.compile(r"unknown(?!\w)", re.IGNORECASE).match(self.text, found.end(), end):
            interval, stop = None, unknown.end()
        else:
            reading = read_pH(self.passage, found.end(), end)
            if reading is None:
                self.fail("a figure is needed after pH, such as 'pH 2' or 'pH 7-9'", found.start(), found.start() + 2)
            interval, stop = reading.interval, reading.end
        if again := _PH.search(self.text, stop, end):
            self.fail("the pH is given twice", again.start(), again.start() + 2)
        if found.start() == start:
            begin, _ = self.trim(stop, end, ",;")
            if begin >= end:
                self.fail(
                    "the pH is here, but not of what; write 'unknown, pH 2' if nothing else is known", start, stop
                )
            return interval, begin, end
        rest = self.text[stop:end].strip()
        if rest and not re.fullmatch(r"\)(?:\s*in\s.*)?|in\s.*|[,;].*", rest, re.IGNORECASE):
            at, until = self.passage.word(stop, end)
            self.fail(f"'{self.said(at, until)}' cannot be placed after the pH", at, until)
        first = found.start()
        if self.text[first - 1] == "(" and self.text[stop : stop + 1] == ")" and not self.resolve(first - 1, stop + 1):
            first, stop = first - 1, stop + 1  # "buffer (pH 7)"
        before = re.compile(r"(?:[\s,;]|\s(?:at|of|with)\s)+$").search(self.text, start, first)
        self.blank(before.start() if before else first, stop)
        begin, until = self.trim(start, end, ",;")
        if begin >= until:
            self.fail("the pH is here, but not of what; write 'unknown, pH 2' if nothing else is known", start, end)
        return interval, begin, until

    def check_brackets(self, start: int, end: int) -> None:
        opened: list[int] = []
        for place in range(start, end):
            if self.text[place] == "(":
                opened.append(place)
            elif self.text[place] == ")":
                if not opened:
                    self.fail("this parenthesis was never opened", place, place + 1)
                opened.pop()
        if opened:
            self.fail("this parenthesis is not closed", opened[-1], opened[-1] + 1)

    # -- lists

    def items(self, start: int, end: int) -> tuple[list[_Item], _Item | None]:
        """The ingredients between two places, and the solvent said after a list in parentheses."""
        close = self.closing(start, end) if self.text[start] == "(" else None
        is_list = (
            close is not None and (close + 1 == end or self.text[close + 1] in " ,") and not self.resolve(start, end)
        )
        if not is_list or close is None:
            return [self.item(start, end, listed=False)], None
        tail: _Item | None = None
        begin, stop = self.trim(close + 1, end, ",")
        if begin < stop:
            after = self.text[begin:stop]
            if found := re.match(r"in\s+", after, re.IGNORECASE):
                tail = self.solvent(begin + found.end(), stop)
            elif after.lower() not in _FORM_OF:
                at, until = self.passage.word(begin, stop)
                self.fail(f"'{self.said(at, until)}' cannot be placed after the parenthesis", at, until)
        parts = self.split(start + 1, close)
        return [self.item(*part, listed=len(parts) > 1) for part in parts], tail

    def closing(self, start: int, end: int) -> int:
        depth = 0
        for place in range(start, end):
            depth += (self.text[place] == "(") - (self.text[place] == ")")
            if depth == 0:
                return place
        return end

    def depths(self, start: int, end: int) -> list[int]:
        depth, result = 0, []
        for place in range(start, end):
            depth += self.text[place] in "(["
            result.append(depth)
            depth -= self.text[place] in ")]"
        return result

    def split(self, start: int, end: int) -> list[tuple[int, int]]:
        """Cut a list at its plus signs, and at commas and 'and' where another ingredient begins behind them."""
        if self.trim(start, end) == (end, end):
            self.fail("there is nothing in these parentheses", start - 1, end + 1)
        depth = self.depths(start, end)
        cuts: list[tuple[int, int]] = []
        for found in re.compile(r"\s\+\s|\s\+|\+\s|\+|;\s|,\s|\s(?:and|&)\s").finditer(self.text, start, end):
            if depth[found.start() - start] != 0 or (cuts and found.start() < cuts[-1][1]):
                continue
            sign = found.group().strip()
            spaced = found.group() != sign and sign == "+"
            if spaced or self.begins_item(found.end(), end, names_too=sign not in ("+", "")):
                cuts.append((found.start(), found.end()))
        parts, begin = [], start
        for cut, after in [*cuts, (end, end)]:
            part = self.trim(begin, cut)
            if part[0] >= part[1]:
                self.fail(
                    "an ingredient is missing beside this '+'",
                    max(start, min(cut, end - 1)),
                    min(after, end) if cut < end else end,
                )
            parts.append(part)
            begin = after
        return parts

    def begins_item(self, start: int, end: int, *, names_too: bool) -> bool:
        """Whether a strength stands at ``start``, or (``names_too``) a known name up to the next comma or plus."""
        start, _ = self.trim(start, end)
        if self.quietly_strength(start, end) or any(
            phrase.match(self.text, start, end) for phrase, _ in _STRENGTH_PHRASES
        ):
            return True
        word = self.text[start:end].split(maxsplit=1)
        if word and word[0].lower() in _STRENGTH_WORDS:
            return True
        stop = re.compile(r"\s\+\s|,\s|;\s|\s(?:and|in)\s|$").search(self.text, start, end)
        return bool(names_too and stop and self.resolve(*self.trim(start, stop.start() if stop else end)))

    # -- one ingredient

    def item(self, start: int, end: int, *, listed: bool, solvent_allowed: bool = True) -> _Item:
        start, end = self.trim(start, end, ",;")
        begun = start
        if start >= end:
            self.fail("a name is missing here", begun, end)
        if self.text[start] == "(" and self.closing(start, end) == end - 1 and not self.resolve(start, end):
            self.fail("a list in parentheses cannot stand here", start, end)
        solvent: _Item | None = None
        if solvent_allowed and not self.resolve(start, end):
            joints = [m for m in _IN.finditer(self.text, start, end) if self.depths(start, end)[m.start() - start] == 0]
            if joints and not _TRAILING_UNKNOWN.search(self.text[start:end]):
                solvent = self.solvent(joints[-1].end(), end)
                end = joints[-1].start()
        strength: Strength | None = None
        form = ""
        strength_place = (start, start)
        match: NameMatch | None = None
        words = (start, end)
        while True:
            start, end = self.trim(start, end, ",;")
            words = (start, end)
            match = self.resolve(start, end)
            # "concentrated nitric acid" may be a name of its own; the strength word says more
            head = self.leading(start, end)
            if head is None and match:
                form = form or self.form_within(start, end, match)
                break
            if head is None:
                tail = self.trailing(start, end)
                if tail is None:
                    break
                said, kind, stop = tail
                if said is not None:
                    if strength is not None and strength.value is not None and said.value is not None:
                        self.fail("the strength is given twice", stop, end)
                    strength = said if strength is None or strength.value is None else strength
                form = form or kind
                end = stop
                continue
            said, kind, stop = head
            if said is None and match:  # a form word that is part of a known name
                break
            if said is not None and said.value is None and match and self.resolve(*self.trim(stop, end, ",;")) is None:
                break
            if said is not None:
                if strength is not None and strength.value is not None and said.value is not None:
                    self.fail("the strength is given twice", start, stop)
                if strength is None or (strength.value is None and said.value is not None):
                    strength = said
                strength_place = (start, stop)
            form = form if kind in ("", "solution") and form else kind or form
            start = stop
        if start >= end:
            if strength is not None:
                self.fail("the strength is here, but not of what", *self.trim(*strength_place))
            self.fail("a name is missing here", begun, max(end, begun + 1))
        if match is None and (match := self.resolve(*words, loosely=True)):
            form = form or next((_FORM_OF[word] for word in match.dropped if word in _FORM_OF), "")
        item = self.named(*words, match)
        if strength is None:
            dissolved = form == "solution" and item.reference.startswith(("substance:", "smiles:", "salt:"))
            vague = listed and item.reference != _WATER
            hidden = item.reference in ("unknown", "unrecognised") and (listed or form == "solution")
            strength = Strength(unit="unknown" if dissolved or vague or hidden or solvent else "neat")
        item = item.model_copy(update={"strength": strength})
        result = _Item(item, form, start=begun, end=words[1])
        if solvent:
            result.solvent, result.solvent_words, result.more = solvent.solvent, solvent.solvent_words, solvent.more
        return result

    def form_within(self, start: int, end: int, match: NameMatch) -> str:
        """The form that a known name says itself: ``zinc powder`` where that is another name of zinc."""
        first, _, rest = self.text[start:end].partition(" ")
        before, _, last = self.text[start:end].rpartition(" ")
        for word, other in ((last, before), (first, rest)):
            if word.lower() not in _FORM_OF or not other.strip():
                continue
            found = self.names.resolve(other)
            if (found.kind, found.id) == (match.kind, match.id):
                return _FORM_OF[word.lower()]
        return ""

    def leading(self, start: int, end: int) -> tuple[Strength | None, str, int] | None:
        """A strength or form word at the front: the strength, the form, and where the rest begins."""
        text = self.text
        if _SMILES.match(text, start, end) or _CAS.match(text, start, end):
            return None
        if ratio := _RATIO.match(text, start, end):
            self.fail(
                "a dilution such as 1:10 is read differently by different people; give M, % or g/L",
                ratio.start(),
                ratio.end(),
            )
        if begins_quantity(self.passage, start, end) and not self.resolve(start, end):
            figures = read_strength(self.passage, start, end)
            if figures:
                stop = self.after_strength(figures[2], end)
                return figures[0], "", stop
            self.check_wrong_unit(start, end)
            return None
        if text[start : start + 1] == "(":  # "concentrated (37 %) hydrochloric acid"
            close = self.closing(start, end)
            if begins_quantity(self.passage, start + 1, close):
                figures = read_strength(self.passage, start + 1, close)
                if figures and self.trim(figures[2], close)[0] >= close:
                    return figures[0], "", close + 1
        for phrase, unit in _STRENGTH_PHRASES:
            if found := phrase.match(text, start, end):
                return Strength(unit=unit), "", found.end()
        found = re.compile(r"(\([a-z.]+\)|[\w.']+)(?:\s+|$)").match(text, start, end)
        if found is None:
            return None
        word = found.group(1).lower()
        if word in _STRENGTH_WORDS:
            return Strength(unit=_STRENGTH_WORDS[word]), "", self.after_strength(found.end(), end)
        if word in _FORM_OF and found.end() < end:
            of = _OF.match(text, found.end(), end)
            return None, _FORM_OF[word], of.end() if of else found.end()
        return None

    def after_strength(self, at: int, end: int) -> int:
        """Skip the ``of`` in "6 % of sodium hypochlorite"."""
        at, _ = self.trim(at, end, ",")
        found = _OF.match(self.text, at, end)
        return found.end() if found else at

    def check_wrong_unit(self, start: int, end: int) -> None:
        """A figure that is no part of a name must have a unit of strength."""
        number = read_number(self.passage, start, end)
        if number is None:
            at, stop = self.passage.word(start, end)
            self.fail(f"'{self.said(at, stop)}' must be followed by a figure and a unit of strength", at, stop)
        joint = re.compile(r"\s*(?:-|to)\s*(?=[\d.])").match(self.text, number[2], end)
        second = read_number(self.passage, joint.end(), end) if joint else None
        where = second[2] if second else number[2]
        if where >= end:
            refuse_unit(self.passage, where, end, ("strength",), "a strength")
        after = self.text[where]
        glued = not after.isspace()
        if glued and not (after.isalpha() and unit_word(self.passage, where, end)):
            return
        at, stop = self.passage.word(where, end)
        if at >= end:
            return
        if read_strength_unit(self.passage, at, end) is None:
            refuse_unit(self.passage, at, end, ("strength",), "a strength")

    def trailing(self, start: int, end: int) -> tuple[Strength | None, str, int] | None:
        """A strength or form word at the back: the strength, the form, and where it begins."""
        text = self.text
        if _SMILES.match(text, start, end) or _UNKNOWN_THING.match(text, start, end):
            return None
        if found := _TRAILING_UNKNOWN.search(text, start, end):
            return Strength(unit="unknown"), "", found.start()
        last = re.compile(r"(?:\s|,\s*|(?=\())(\([a-z.]+\)|[\w.']+)$").search(text, start, end)
        if last and last.start() > start:
            word = last.group(1).lower()
            if word in _FORM_OF:
                return None, _FORM_OF[word], last.start()
            if word in _STRENGTH_WORDS:
                return Strength(unit=_STRENGTH_WORDS[word]), "", last.start()
        # figures at the back: "hydrogen peroxide 30 %", "nitric acid (2 M)", "HCl, 37 %"
        for found in re.compile(r"[\s(,](?=[\d.~]|about\b|ca\b|approx)").finditer(text, start, end):
            begin = found.start()
            inside = text[begin] == "("
            stop = end
            if inside:
                if self.closing(begin, end) != end - 1:
                    continue
                stop = end - 1
            try:
                figures = read_strength(self.passage, begin + 1, stop)
            except InputError:
                if self.resolve(*self.trim(start, begin, ",;")):
                    raise
                continue
            if figures and self.trim(figures[2], stop)[0] >= stop:
                return figures[0], "", begin
        return None

    # -- names

    def named(self, start: int, end: int, match: NameMatch | None) -> Ingredient:
        words, span = self.said(start, end).strip(), self.passage.span(start, end)
        if match:
            return Ingredient(words=words, reference=f"{match.kind}:{match.id}", hydrate=match.extra_water, span=span)
        if found := _SMILES.match(self.text, start, end):
            self.check_smiles(found.start("string"), found.end("string"))
            self.nothing_after(found.end(), end, "the SMILES string")
            return Ingredient(words=words, reference=f"smiles:{found['string']}", span=span)
        if found := _CAS.match(self.text, start, end):
            match = self.cas(found.start("number"), found.end("number"))
            self.nothing_after(found.end(), end, "the CAS number")
            reference = f"{match.kind}:{match.id}" if match else "unrecognised"
            return Ingredient(words=words, reference=reference, hydrate=match.extra_water if match else 0.0, span=span)
        if _CAS_NUMBER.fullmatch(self.text[start:end]):
            self.cas(start, end)
        if found := re.compile(r"(CAS|SMILES)(?![\w])", re.IGNORECASE).match(self.text, start, end):
            what = "a number such as 7732-18-5" if found[1].upper() == "CAS" else "a string such as CCO"
            self.fail(f"{what} must follow '{found[1]}'", *found.span(1))
        if self.text[start:end].lower() in _FORM_OF:
            self.fail(f"'{words}' is here, but not of what", start, end)
        if _UNKNOWN_THING.match(self.text, start, end):
            return Ingredient(words=words, reference="unknown", span=span)
        twin = self.synonym(start, end)
        if twin:
            return Ingredient(words=words, reference=f"{twin.kind}:{twin.id}", hydrate=twin.extra_water, span=span)
        self.check_left_over(start, end)
        plain = " ".join(self.text[start:end].split())
        return Ingredient(
            words=words, reference="unrecognised", suggestions=tuple(self.names.suggest(plain, 3)), span=span
        )

    def nothing_after(self, at: int, end: int, what: str) -> None:
        at, stop = self.passage.word(at, end)
        if at < stop:
            self.fail(f"'{self.said(at, stop)}' cannot be placed after {what}", at, stop)

    def cas(self, start: int, end: int) -> NameMatch | None:
        number = self.text[start:end].rstrip(",;.")
        end = start + len(number)
        if not _CAS_NUMBER.fullmatch(number):
            self.fail("this is no CAS number; one looks like 7732-18-5", start, end)
        digits = number.replace("-", "")
        if sum(place * int(digit) for place, digit in enumerate(reversed(digits[:-1]), 1)) % 10 != int(digits[-1]):
            self.fail("the check digit of this CAS number does not fit; a figure is wrong or swapped", start, end)
        return self.resolve(start, end)

    def check_smiles(self, start: int, end: int) -> None:
        closers = {")": "(", "]": "["}
        opened: list[int] = []
        for place in range(start, end):
            sign = self.text[place]
            if not _SMILES_CHARACTERS.match(sign):
                self.fail("this character cannot stand in a SMILES string", place, place + 1)
            if sign in "([":
                opened.append(place)
            elif sign in ")]":
                if not opened or self.text[opened[-1]] != closers[sign]:
                    self.fail("this bracket of the SMILES string was never opened", place, place + 1)
                opened.pop()
        if opened:
            self.fail("this bracket of the SMILES string is not closed", opened[-1], opened[-1] + 1)
        if not any(self.text[place].isalpha() or self.text[place] == "*" for place in range(start, end)):
            self.fail("this SMILES string holds no atom", start, end)

    def synonym(self, start: int, end: int) -> NameMatch | None:
        """``hydrogen peroxide (H2O2)``: two names of one thing."""
        if self.text[end - 1] != ")":
            return None
        opening = self.text.rfind("(", start, end)
        if opening <= start or self.closing(opening, end) != end - 1:
            return None
        first = self.resolve(*self.trim(start, opening))
        if first is None:
            return None
        second = self.resolve(opening + 1, end - 1)
        if second is None:
            inner = self.trim(opening + 1, end - 1)
            self.fail(
                f"'{self.said(*inner)}' cannot be placed after '{self.said(*self.trim(start, opening))}'",
                *inner,
                tuple(self.names.suggest(self.text[inner[0] : inner[1]], 3)),
            )
            return None
        if (first.kind, first.id) != (second.kind, second.id):
            self.fail("this is another substance than the name before it", opening + 1, end - 1)
        return first

    def check_left_over(self, start: int, end: int) -> None:
        """Errors for what reads as more than one name; what passes is an unknown name."""
        text = self.text
        if not any(sign.isalpha() for sign in text[start:end]):
            self.fail("no name can be read here", start, end)
        for found in re.compile(r"[^\w\s()\[\]{},.'+\-·*:/&%°\"₀-₉⁰-⁹⁺⁻²³¹]").finditer(text, start, end):
            self.fail(f"'{self.said(found.start(), found.end())}' cannot be placed", found.start(), found.end())
        depth = self.depths(start, end)
        for found in re.compile(r"\s\+\s*|\s*\+\s|\+").finditer(text, start, end):
            sign = text.index("+", found.start())
            after, _ = self.trim(sign + 1, end)
            if depth[found.start() - start] == 0 and (found.group() != "+" or self.quietly_strength(after, end)):
                if self.is_amount(after, end):
                    self.fail("these are two portions; give them one by one", sign, sign + 1)
                self.fail("the parts of one solution go into parentheses, as in '1 L of (a + b)'", sign, sign + 1)
        for found in re.compile(r"\s(and|&)\s", re.IGNORECASE).finditer(text, start, end):
            left, right = self.trim(start, found.start()), self.trim(found.end(), end)
            if self.resolve(*left) or self.resolve(*right) or self.quietly_strength(*right):
                self.fail(
                    "these are two things; the parts of one solution go into parentheses, as in '1 L of (a + b)'",
                    *found.span(1),
                )
        for found in re.compile(r",\s*|;\s*|\s+\(").finditer(text, start, end):
            if found.start() > start and self.resolve(*self.trim(start, found.start())):
                at, stop = self.trim(found.end(), end, "()")
                self.fail(
                    f"'{self.said(at, stop)}' cannot be placed after '{self.said(start, found.start())}'",
                    at,
                    stop,
                    closest(text[at:stop], [*_FORM_OF, *_STRENGTH_WORDS], cutoff=70.0),
                )
        words = list(re.compile(r"\S+").finditer(text, start, end))
        for word in words[1:]:
            if begins_quantity(self.passage, word.start(), end) and self.quietly_strength(word.start(), end):
                stop = self.passage.word(word.end(), end)[1] if word.group()[-1].isdigit() else word.end()
                self.fail("a strength stands before or after the whole name, not within it", word.start(), stop)
        if words[-1].group().lower() == "in":
            self.fail("a solvent is missing after 'in'", *words[-1].span())
        for word in words:
            if word.group().lower() in _STRAY:
                self.fail(f"'{word.group()}' cannot be placed in a portion", *word.span())
        self.check_misspelt_modifier(words, start, end)

    def is_amount(self, start: int, end: int) -> bool:
        try:
            return read_quantity(self.passage, start, end, AMOUNT_DIMENSIONS, "an amount", optional=True) is not None
        except InputError:
            return False

    def check_misspelt_modifier(self, words: list[re.Match[str]], start: int, end: int) -> None:
        """``zinc powdr``, ``concentrted nitric acid``, ``NaOH blarg``: the name is known and one word beside it
        is not.
        """
        if len(words) < 2:
            return
        known = [word for word in (*_FORM_OF, *_STRENGTH_WORDS) if len(word) > 3 and word.isalpha()]
        for word, rest in ((words[-1], (start, words[-2].end())), (words[0], (words[1].start(), end))):
            if self.resolve(*rest):
                near = closest(word.group(), known, 2, cutoff=80.0)
                if near:
                    self.fail(f"'{word.group()}' cannot be placed beside '{self.said(*rest)}'", *word.span(), near)
        first = words[0].group()
        if self.resolve(*words[0].span()) and (any(s.isdigit() for s in first) or sum(s.isupper() for s in first) > 1):
            stray = self.passage.word(words[0].end(), end)
            self.fail(f"'{self.said(*stray)}' cannot be placed after the formula '{first}'", *stray)

    # -- solvents

    def solvent(self, start: int, end: int) -> _Item:
        """What stands after ``in``: a solvent, or a solution in water (then its ingredients are in ``more``)."""
        start, end = self.trim(start, end, ",")
        if start >= end:
            self.fail("a solvent is missing after 'in'", max(0, start - 1), max(start, 1))
        if self.text[start] == "(" and self.closing(start, end) == end - 1 and not self.resolve(start, end):
            parts = self.split(start + 1, end - 1)
            read = [self.item(*part, listed=len(parts) > 1) for part in parts]
        else:
            read = [self.item(start, end, listed=False, solvent_allowed=False)]
        inner = next((item for item in read if item.solvent), None)
        if len(read) == 1 and read[0].ingredient.strength.unit == "neat":
            found = read[0].ingredient
            result = _Item(found, solvent=found.reference, solvent_words=found.words, start=start, end=end)
            if found.reference in ("unrecognised", "unknown"):
                # kept among the ingredients too, so that no report overlooks it
                result.more = (found.model_copy(update={"strength": Strength(unit="unknown")}),)
            elif found.reference.startswith("material:"):
                result.solvent, result.solvent_words, result.more = _WATER, "water", (found,)
            return result
        return _Item(
            read[0].ingredient,
            solvent=inner.solvent if inner else _WATER,
            solvent_words=inner.solvent_words if inner else "water",
            more=tuple(item.ingredient for item in read) + (inner.more if inner else ()),
            start=start,
            end=end,
        )

    # -- putting it together

    def assemble(
        self,
        amount: Interval,
        unit: Literal["L", "g", "mol"],
        items: list[_Item],
        tail: _Item | None,
        pH: Interval | None,
    ) -> Portion:
        solvent, solvent_words = "", ""
        for part in [*items, *([tail] if tail else [])]:
            if part.solvent and solvent and part.solvent != solvent:
                self.fail("two solvents are given; one solution has one", part.start, part.end)
            solvent, solvent_words = part.solvent or solvent, part.solvent_words or solvent_words
        ingredients = [item.ingredient for item in items]
        ingredients += [more for part in [*items, *([tail] if tail else [])] for more in part.more]
        # water in a list is the solvent of the others
        if len(ingredients) > 1:
            dry = [one for one in ingredients if not (one.reference == _WATER and one.strength.value is None)]
            ingredients = dry or ingredients[:1]
        for kind in ("w/w", "mass ppm"):
            stated = [one.strength.value.low for one in ingredients if one.strength.unit == kind and one.strength.value]
            if sum(stated) > (1.0 if kind == "w/w" else 1e6) * (1 + 1e-6):
                self.fail("the strengths of this solution add up to more than 100 %", items[0].start, items[-1].end)
        forms = [item.form for item in items if item.form]
        return Portion(
            text=self.passage.text.strip(),
            amount=amount,
            unit=unit,
            ingredients=tuple(ingredients),
            solvent=solvent or _WATER,
            solvent_words=solvent_words or "water",
            pH=pH,
            form=forms[0] if forms else "",
        )
