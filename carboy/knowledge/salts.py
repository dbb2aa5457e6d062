"""Salts that the graph does not list, read from their formula or systematic name as a sum of ions that it knows.

A formula is cut into ions as they are spelled (``K2Cr2O7``, ``Co(NO3)2·6H2O``, ``CH3COORb``), a name into cation and anion
(``cobalt(II) chlorate``). The charges must balance. Where an element has several charges only those are kept that do; of
several readings the one with the fewest ions is meant (a complex ion before its parts), and two that differ in what they
give in water are no reading at all: nothing is guessed.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from functools import cached_property
from itertools import product
from math import gcd

from msgspec import Struct

from carboy.knowledge.equilibria import components_of
from carboy.knowledge.folding import fold
from carboy.model.knowledge import Index
from carboy.text.formulas import elements, is_formula, plain_formula

MOST_GROUPS = 8  # ions of different kinds or places in one formula
_MOST_READINGS = 500
_LONGEST = 80  # characters; longer texts are no salt of a few ions
_WATER, _PROTON = "H2O", "H+"
_OPEN = {"(": ")", "[": "]", "{": "}"}
_COUNT = re.compile(r"\d+")
_COEFFICIENT = re.compile(r"\d+(?:\.\d+)?")
_TIMES = {"mono": 1, "di": 2, "tri": 3, "tetra": 4}
_MANY = re.compile(rf"(?P<times>{'|'.join(_TIMES)})(?=[a-z])", re.IGNORECASE)
_UNNAMED = "X"  # stands for matter that a label does not name; no label writes it

Group = tuple[str, int]  # spelling of an ion, how often


class Salt(Struct, frozen=True):
    """A salt as a sum of ions: token of a species -> how often, cations first; ``water`` of crystallisation, mol per formula unit."""

    ions: tuple[tuple[str, float], ...]
    water: float = 0.0

    @property
    def sum(self) -> str:
        """``Co+2 + 2 ClO3-``."""
        return " + ".join(token if count == 1 else f"{count:g} {token}" for token, count in self.ions)


class SaltReader:
    """Reads salts with the ions of one index."""

    def __init__(self, index: Index) -> None:
        self.index = index

    @cached_property
    def _spellings(self) -> dict[str, tuple[str, ...]]:
        """Formula of an ion without its charge, as it is spelled -> tokens of the ions that are spelled so."""
        found: dict[str, list[str]] = {}
        for token, item in self.index.species.items():
            if item.phase == "aq" and item.charge and _UNNAMED not in item.atoms and is_formula(item.formula):
                found.setdefault(item.formula, []).append(token)
        for key, target in self.index.names.items():
            if key.startswith("spelling:"):
                found.setdefault(key.removeprefix("spelling:"), []).append(target.partition(":")[2])
        return {spelling: tuple(dict.fromkeys(tokens)) for spelling, tokens in found.items()}

    @cached_property
    def _by_first(self) -> dict[str, tuple[str, ...]]:
        """First letter -> spellings that begin with it, longest first."""
        found: dict[str, list[str]] = {}
        for spelling in sorted(self._spellings, key=len, reverse=True):
            found.setdefault(spelling[0], []).append(spelling)
        return {letter: tuple(spellings) for letter, spellings in found.items()}

    @cached_property
    def _ions(self) -> dict[str, str]:
        """Folded name of an ion -> its token."""
        return {
            key.removeprefix("ion:"): target.partition(":")[2]
            for key, target in self.index.names.items()
            if key.startswith("ion:")
        }

    def read(self, text: str) -> Salt | None:
        """The salt that ``text`` names, or None if it is none of known ions, or may be two."""
        found = self.readings(text)
        return found[0] if len(found) == 1 else None

    def readings(self, text: str) -> tuple[Salt, ...]:
        """Every salt that ``text`` may be (several if it is ambiguous), the likeliest kind of reading only."""
        written = plain_formula(text)
        if len(text) > _LONGEST:
            return ()
        if " " not in text.strip() and written[:1] in {*_OPEN, *_CAPITALS} and is_formula(written):
            return self._by_formula(written)
        return self._by_name(text)

    def name(self, salt: Salt) -> str:
        """Its systematic name, or its formula if an ion of it has no name."""
        names = [
            self.index.species[token].name.partition(",")[0].removesuffix(" ion").strip() for token, _ in salt.ions
        ]
        return " ".join(names) if all(names) else self.formula(salt)

    def formula(self, salt: Salt) -> str:
        """``Co(ClO3)2``."""
        parts = []
        for token, count in salt.ions:
            formula = self.index.species[token].formula
            single = formula in elements()
            parts.append(formula if count == 1 else f"{formula}{count:g}" if single else f"({formula}){count:g}")
        return "".join(parts)

    # --- formulas

    def _by_formula(self, written: str) -> tuple[Salt, ...]:
        water, choices = 0.0, []
        for unit in written.split("·"):
            number = _COEFFICIENT.match(unit)
            count = float(number.group()) if number else 1.0
            body = unit[number.end() :] if number else unit
            if body == _WATER:
                water += count
                continue
            choices.append([{token: n * count for token, n in ions.items()} for ions in self._units(body)])
        if not choices or not all(choices):
            return ()
        totals = []
        for picked in product(*choices):
            total: dict[str, float] = {}
            for ions in picked:
                for token, n in ions.items():
                    total[token] = total.get(token, 0.0) + n
            totals.append(total)
        return self._best(totals, water)

    def _best(self, totals: list[dict[str, float]], water: float) -> tuple[Salt, ...]:
        """The readings with the fewest ions, one for each outcome in water."""
        outcomes: dict[tuple[tuple[str, float], ...], list[dict[str, float]]] = {}
        for ions in totals:
            made = components_of(ions, self.index)
            key = tuple(sorted((token, round(n, 9)) for token, n in made.items() if abs(n) > 1e-9 and token != _WATER))
            if key:  # HOH is no salt
                outcomes.setdefault(key, []).append(ions)
        if not outcomes:
            return ()
        size = {key: min(sum(ions.values()) for ions in alike) for key, alike in outcomes.items()}
        fewest = min(size.values())
        found = [min(alike, key=self._plainness) for key, alike in outcomes.items() if size[key] == fewest]
        return tuple(Salt(self._ordered(ions), water) for ions in found)

    def _plainness(self, ions: Mapping[str, float]) -> tuple[int, float]:
        """Of readings that are the same in water the one whose ions have names, then the one with fewer ions is shown."""
        return sum(not self.index.species[token].name for token in ions), sum(ions.values())

    def _ordered(self, ions: Mapping[str, float]) -> tuple[tuple[str, float], ...]:
        order = sorted(ions.items(), key=lambda item: (self.index.species[item[0]].charge < 0, item[0] == _PROTON))
        return tuple((token, float(count)) for token, count in order)

    def _units(self, text: str) -> list[dict[str, float]]:
        """Neutral sums of ions that one unit of a formula can be."""
        found = []
        for number, groups in enumerate(self._cut(text, 0)):
            if number > _MOST_READINGS or len(groups) > MOST_GROUPS:
                break
            options = [self._spellings[spelling] for spelling, _ in groups]
            for tokens in product(*options):
                charge = sum(
                    self.index.species[token].charge * count for token, (_, count) in zip(tokens, groups, strict=True)
                )
                if charge:
                    continue
                ions: dict[str, float] = {}
                for token, (_, count) in zip(tokens, groups, strict=True):
                    ions[token] = ions.get(token, 0.0) + count
                found.append(ions)
        return found

    def _cut(self, text: str, at: int) -> Iterator[tuple[Group, ...]]:
        """Every way to cut ``text`` from ``at`` into ions as they are spelled."""
        if at == len(text):
            yield ()
            return
        for groups, end in self._first(text, at):
            for rest in self._cut(text, end):
                yield (*groups, *rest)

    def _first(self, text: str, at: int) -> Iterator[tuple[tuple[Group, ...], int]]:
        """What can stand first at ``at``: an ion, an element many times, a bracket; and where the rest begins."""
        for spelling in self._by_first.get(text[at], ()):
            if not text.startswith(spelling, at):
                continue
            end = at + len(spelling)
            following = text[end : end + 1]
            if following.islower() or (following.isdigit() and spelling not in elements()):
                continue
            number = _COUNT.match(text, end)
            if number and spelling in elements():
                if int(number.group()) > 0:
                    yield ((spelling, int(number.group())),), number.end()
            else:
                yield ((spelling, 1),), end
        if text[at] in _OPEN:
            close = _closing(text, at)
            if close is None:
                return
            number = _COUNT.match(text, close + 1)
            count = int(number.group()) if number else 1
            end = number.end() if number else close + 1
            inner = text[at + 1 : close]
            if inner and count:
                for groups in self._cut(inner, 0):
                    yield tuple((spelling, n * count) for spelling, n in groups), end

    # --- names

    def _by_name(self, text: str) -> tuple[Salt, ...]:
        """Cation and anion by their names. The balance of charge gives their numbers; a prefix must agree with it. A metal
        whose charge is left open has a reading for each of its ions.
        """
        words = text.split()
        if not 2 <= len(words) <= 6:
            return ()
        found: dict[tuple[str, int, str, int], None] = {}
        for cut in range(1, len(words)):
            anion = self._ion(" ".join(words[cut:]), negative=True)
            if anion is None:
                continue
            for first, times in _without_prefix(" ".join(words[:cut])):
                known = self._ion(first, negative=False)
                for cation in self._of_element(first) if known is None else (known,):
                    plus, minus = self.index.species[cation].charge, -self.index.species[anion].charge
                    shared = gcd(plus, minus)
                    if times is None or times == minus // shared:
                        found[cation, minus // shared, anion, plus // shared] = None
        return tuple(
            Salt(((cation, float(cations)), (anion, float(anions)))) for cation, cations, anion, anions in found
        )

    def _of_element(self, name: str) -> tuple[str, ...]:
        """The cations that an element may be where several are known and its charge is not said."""
        folded = fold(name)
        ions = tuple(self._ions[key] for numeral in _ROMAN if (key := f"{folded}<{numeral}>") in self._ions)
        return ions if len(ions) > 1 else ()

    def _ion(self, name: str, *, negative: bool) -> str | None:
        """The token of a named ion of this sign; the number of a charge may stand with an element that has one charge only."""
        folded = fold(name)
        token = self._ions.get(folded)
        numbered = re.fullmatch(r"(?P<element>[a-z]+)<(?P<charge>[ivx]+)>", folded)
        if token is None and numbered:
            token = self._ions.get(numbered["element"])
            if token is not None and _ROMAN.get(numbered["charge"]) != self.index.species[token].charge:
                return None
        if token is None or token == _PROTON:
            return None
        return token if (self.index.species[token].charge < 0) == negative else None


_CAPITALS = frozenset("ABCDEFGHIJKLMNOPQRSTUVWXYZ")
_ROMAN = {"i": 1, "ii": 2, "iii": 3, "iv": 4, "v": 5, "vi": 6}


def _closing(text: str, at: int) -> int | None:
    depth = 0
    for place in range(at, len(text)):
        depth += (text[place] in _OPEN) - (text[place] in _OPEN.values())
        if depth == 0:
            return place
    return None


def _without_prefix(name: str) -> Iterator[tuple[str, int | None]]:
    """``disodium`` as it stands, and as twice sodium."""
    yield name, None
    many = _MANY.match(name)
    if many:
        yield name[many.end() :], _TIMES[many["times"].lower()]
