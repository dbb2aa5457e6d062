"""From what stands on a label to what the index knows: names, formulas, CAS numbers, hydrates; and suggestions for
the rest.

Nothing is guessed: a text is taken for a thing only if its folded name, its formula or its number is in the index, or
a rule of this module brings it there (water of crystallisation, "solution", the form of a solid), or it is a salt of
ions that the index knows. Near spellings are suggestions only.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from functools import cached_property
from typing import Literal

from msgspec import Struct
from msgspec.structs import replace

from carboy.errors import InputError
from carboy.knowledge.cas import check_digit_fits, has_cas_form
from carboy.knowledge.folding import fold
from carboy.knowledge.naming import composition_key
from carboy.knowledge.salts import SaltReader
from carboy.model.knowledge import Index
from carboy.span import Span
from carboy.text.formulas import as_token, elements, hill_formula, is_formula, parse_formula, plain_formula

Kind = Literal["substance", "material", "species", "salt", "unrecognised"]

_WATER = {
    "hemi": 0.5,
    "mono": 1.0,
    "sesqui": 1.5,
    "di": 2.0,
    "tri": 3.0,
    "tetra": 4.0,
    "penta": 5.0,
    "hexa": 6.0,
    "hepta": 7.0,
}
_WATER |= {"octa": 8.0, "ennea": 9.0, "nona": 9.0, "deca": 10.0, "undeca": 11.0, "dodeca": 12.0, "octadeca": 18.0}
_SHORTEST_LIMIT = 5  # letters and figures by which a published limit can be told
_HYDRATE_WORD = re.compile(
    rf"[\s,-]*\b(?P<count>{'|'.join(sorted(_WATER, key=len, reverse=True))})?-?hydrate\b", re.IGNORECASE
)
_HYDRATE_FORMULA = re.compile(r"\s*[·.*•⋅∙(x×]\s*(?P<count>\d+(?:\.\d+)?|½)?\s*H[2₂]O\)?\s*$")
_CAS_LABEL = re.compile(r"cas(?:[\s-]*(?:no|nr|number|rn|registry number)\.?)?[\s:#]*(?=\d)", re.IGNORECASE)
# words that say in which form a thing comes, not what it is; "fuming", "glacial", "white" and the like do, so they
# are not here
_SOLUTION_WORDS = (
    "aqueous solution",
    "water solution",
    "solution in water",
    "in water",
    "solutions",
    "solution",
    "soln",
    "aqueous",
    "aq",
)
_FORM_WORDS = (
    "powder", "dust", "granules", "granulated", "granular", "filings", "turnings", "chips", "shavings", "foil",
    "wire", "ribbon", "rod", "sheet", "pellets", "pieces", "lumps", "chunks", "crystals", "crystalline", "flakes",
    "beads", "prills", "shot", "sticks", "metal",
    "gas", "anhydrous", "pure", "reagent", "reagent grade", "technical", "technical grade",
    "laboratory grade", "analytical grade", "acs",
)  # fmt: skip


class Match(Struct, frozen=True):
    """What a text means.

    ``id`` is a substance id, material id, species token, or for a salt that is not listed the sum of its ions
    (``Co+2 + 2 ClO3-``), by ``kind`` ("" if unrecognised). ``extra_water``: mol
    water of crystallisation per formula unit beyond what the substance of the index has; it adds to molar mass and
    yields. ``dropped`` are words that were passed over ("solution", "powder"), ``notes`` sentences for the
    assumptions of a report.
    """

    kind: Kind
    id: str
    text: str
    extra_water: float = 0.0
    dropped: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()

    @property
    def recognised(self) -> bool:
        return self.kind != "unrecognised"

    @property
    def target(self) -> str:
        """As in the table of names: ``substance:zinc``."""
        return f"{self.kind}:{self.id}"


class Names:
    """Resolves names against one index. Making one costs nothing; the table is in the index."""

    def __init__(self, index: Index) -> None:
        self.index = index
        self._names = index.names

    # --- substances, materials, species

    def resolve(self, text: str) -> Match:
        """What ``text`` means, in this order: CAS number, formula with its case, name, species token, formula without
        case, name with the words of form taken off, hydrate of a known substance, salt of known ions.

        An unknown name or number gives a Match of kind "unrecognised". Raises InputError for a CAS number whose check
        digit is wrong.
        """
        cleaned = " ".join(text.split())
        found = self._by_number(cleaned) or self._plain(cleaned) or self._by_parts(cleaned) or self._salt(cleaned)
        return replace(found, text=text) if found else Match("unrecognised", "", text)

    def _by_number(self, text: str) -> Match | None:
        number = _CAS_LABEL.sub("", text, count=1) if _CAS_LABEL.match(text) else text
        number = re.sub(r"[‐‑‒–−]", "-", number).strip()
        if not has_cas_form(number):
            return None
        if not check_digit_fits(number):
            at = max(0, text.find(number))
            raise InputError(
                f"'{number}' is no CAS number: its check digit is wrong", span=Span(text, at, max(at + 1, len(text)))
            )
        return self._target(f"cas:{number}", text) or Match("unrecognised", "", text)

    def _target(self, key: str, text: str) -> Match | None:
        target = self._names.get(key)
        if target is None:
            return None
        kind, _, identifier = target.partition(":")
        return Match("material" if kind == "material" else "substance", identifier, text)

    def _plain(self, text: str) -> Match | None:
        """The text as it stands: formula, name, token, composition, formula in the wrong case."""
        compact = "".join(text.split())
        written = plain_formula(compact)
        found = self._target(f"formula:{written}", text) or self._target(fold(text), text)
        if found:
            return found
        if text in self.index.species:
            return Match("species", text, text)
        if " " in text.strip():
            return None
        if not is_formula(written):
            # "co" may be Co or CO; only what cannot be an element is looked for without its case
            lower = None if text.capitalize() in elements() else self._target(f"lower:{written.casefold()}", text)
            return lower or self._target(f"smiles:{text}", text)
        formula = parse_formula(written)
        if formula.charge or formula.state:
            return self._ion(as_token(written), formula.atoms, formula.charge, text) if formula.charge else None
        key = composition_key(formula.atoms)
        return (self._target(key, text) if key else None) or self._target(f"smiles:{text}", text)

    def _ion(self, token: str, atoms: dict[str, float], charge: int, text: str) -> Match | None:
        """An ion written as people do (``Fe3+``, ``CH3COO-``): its token, or the component with these atoms and
        charge.
        """
        if token in self.index.species:
            return Match("species", token, text)
        for known, item in self.index.species.items():
            if item.component and item.charge == charge and item.atoms == atoms:
                return Match("species", known, text)
        return None

    def _by_parts(self, text: str) -> Match | None:
        """Words of form taken off, words turned round at a comma, a plural, a hydrate of a known substance."""
        for name, dropped in _variants(text):
            found = self._plain(name) if dropped else None
            if found and "anhydrous" in dropped:
                found = self._without_water(found)
            if found is None:
                found = self._hydrate(name)
            if found:
                return replace(found, dropped=tuple(word for word in dropped if word))
        return None

    def _hydrate(self, text: str) -> Match | None:
        """``copper sulfate pentahydrate``, ``CuSO4.7H2O`` from the substance without that water, if that is known."""
        by_word = _HYDRATE_WORD.search(text)
        by_formula = _HYDRATE_FORMULA.search(text)
        count: float | None
        if by_word:
            base = (text[: by_word.start()] + text[by_word.end() :]).strip(" ,-")
            count = _WATER[by_word["count"].lower()] if by_word["count"] else None
        elif by_formula:
            base = text[: by_formula.start()].strip(" ,-")
            written = by_formula["count"] or "1"
            count = 0.5 if written == "½" else float(written)
        else:
            return None
        found = self._plain(base) if base else None
        if found is None or found.kind != "substance":
            return None
        if count is None:
            note = f"The water of crystallisation of '{text}' is not stated; counted as {self.display(found.target)}."
            return replace(found, text=text, notes=(note,))
        water = self._own_water(found)
        if water and count < water:  # "copper sulfate" may stand for its usual hydrate
            anhydrous = self._without_water(found)
            return replace(anhydrous, text=text, extra_water=count) if anhydrous else None
        return replace(found, text=text, extra_water=count - water)

    @cached_property
    def salts(self) -> SaltReader:
        """Reads salts that are not listed."""
        return SaltReader(self.index)

    def _salt(self, text: str) -> Match | None:
        """A salt of known ions, as a formula or a systematic name, with or without water of crystallisation."""
        for name, dropped in _variants(text):
            water, base = 0.0, name
            by_word = _HYDRATE_WORD.search(name)
            if by_word:
                if not by_word["count"]:
                    continue
                water = _WATER[by_word["count"].lower()]
                base = (name[: by_word.start()] + name[by_word.end() :]).strip(" ,-")
            salt = self.salts.read(base)
            if salt is not None:
                taken_off = tuple(word for word in dropped if word)
                return Match("salt", salt.sum, text, extra_water=salt.water + water, dropped=taken_off)
        return None

    def _own_water(self, match: Match) -> float:
        return parse_formula(self.index.substances[match.id].formula).water if match.kind == "substance" else 0.0

    def _without_water(self, match: Match) -> Match | None:
        """The anhydrous substance of a match; None if only the hydrate is known (the other may react with water)."""
        if not self._own_water(match):
            return match
        base = plain_formula(self.index.substances[match.id].formula).partition("·")[0]
        return self._target(f"formula:{base}", match.text)

    def suggest(self, text: str, n: int = 3) -> tuple[str, ...]:
        """Up to ``n`` names of substances and materials that are spelled nearly like ``text``, nearest first; they
        may be none.
        """
        from rapidfuzz import fuzz, process

        compact = plain_formula("".join(text.split()))
        same_letters = [
            self._names[key]
            for key in self._names
            if key.startswith("formula:") and key.removeprefix("formula:").casefold() == compact.casefold()
        ]
        folded = fold(text)
        keys = [key for key in self._names if ":" not in key]
        near = process.extract(folded, keys, scorer=fuzz.ratio, limit=4 * n, score_cutoff=72)
        if len(folded) > 3:
            longer = process.extract(folded, keys, scorer=fuzz.partial_ratio, limit=4 * n, score_cutoff=92)
            near += [item for item in longer if len(item[0]) >= len(folded)]
        isomers = []
        if is_formula(compact):
            wanted = hill_formula(parse_formula(compact).atoms)
            isomers = [
                f"substance:{key}" for key, item in self.index.substances.items() if hill_formula(item.atoms) == wanted
            ]
        targets = dict.fromkeys([*same_letters, *isomers, *(self._names[key] for key, _, _ in near)])
        salts = [self.salts.name(salt) for salt in self.salts.readings(text)]
        return tuple(dict.fromkeys([*salts, *(self.display(target) for target in targets)]))[:n]

    def display(self, target: str) -> str:
        """``substance:zinc`` -> its preferred name."""
        kind, _, identifier = target.partition(":")
        if kind == "substance":
            return self.index.substances[identifier].name
        if kind == "material":
            return self.index.materials[identifier].name
        return identifier

    # --- the other kinds

    def container(self, text: str) -> str | None:
        """Id of a container material, or None."""
        return self._other("container", text)

    def chemical_class(self, text: str) -> str | None:
        """Key of a chemical class from its key, label or plural (``methyl ketones``), or None."""
        return self._other("class", text)

    def published_limits(self, text: str) -> dict[str, dict[str, float]]:
        """Kind of limit -> mg/L by report key, of those that ``text`` names: by their own name (``toxicity characteristic``, ``universal
        treatment standard``) or by their place in the code (``40 CFR 268.48``, ``261.24``); {} if none."""
        wanted = re.sub(r"[^a-z0-9.]", "", text.casefold().replace("standards", "standard").removeprefix("the "))
        plain = wanted.removesuffix("limit").removesuffix("limits").removesuffix("standard")
        found: dict[str, dict[str, float]] = {}
        if len(plain) < _SHORTEST_LIMIT:
            return found
        for limit in self.index.limits:
            kind = limit.kind.replace("-", "")
            source = limit.value.source.casefold()
            if kind.startswith(plain) or plain in (source, source.removeprefix("40cfr")):
                found.setdefault(limit.kind, {})[limit.subject] = limit.value.magnitude
        return found

    def no_longer_seen(self) -> float:
        """mol/L below which test papers and strips no longer show a thing."""
        return self.index.thresholds["destroyed-strength"].value.magnitude

    def gas(self, text: str) -> str | None:
        """Token of a gas from its name, formula or token (``hydrogen sulfide``, ``H2S``, ``H2S(g)``), or None."""
        for token in (text, f"{plain_formula(text)}(g)"):
            if token in self.index.gases:
                return token
        named = self._other("gas", text) or self._other("gas", f"{text} gas")
        if named is None:
            match = self._plain(text)
            if match and match.kind == "substance":
                token = f"{plain_formula(self.index.substances[match.id].formula)}(g)"
                named = token if token in self.index.gases else None
        return named

    def report_keys(self, text: str) -> tuple[str, ...]:
        """Report keys that ``mercury``, ``Hg``, ``chromium(VI)``, ``Cr(VI)`` or ``cyanide`` cover, in steady order;
        () if none.

        An element covers all its oxidation states; the name of a component or of a class of components covers these.
        """
        wanted = fold(text)
        # molecules that are their own component answer to their names, not to those of elements
        components = [
            c for c in self.index.species.values() if c.component and c.report_key and c.report_key != c.token
        ]
        exact = {c.report_key for c in components if c.report_key == text}
        if exact and not any(item.symbol == text for item in elements().values()):
            return tuple(sorted(exact))
        symbols = [item.symbol for item in elements().values() if wanted in (fold(item.name), fold(item.symbol))]
        numbered = re.fullmatch(r"(?P<name>[a-z]+)<(?P<number>[ivx]+)>", wanted)
        if numbered:
            for item in elements().values():
                if numbered["name"] in (fold(item.name), fold(item.symbol)):
                    key = fold(f"{item.symbol}({numbered['number']})")
                    return tuple(sorted({c.report_key for c in components if fold(c.report_key) == key}))
        if symbols:
            return tuple(
                sorted({c.report_key for c in components if re.fullmatch(rf"{symbols[0]}(?:\(.*\))?", c.report_key)})
            )
        named = {c.report_key for c in components if wanted in (fold(c.name).removesuffix("ion"), fold(c.report_key))}
        if named:
            return tuple(sorted(named))
        match = self._plain(text)
        if match and match.id in self.index.species:
            return (self.index.species[match.id].report_key,) if self.index.species[match.id].component else ()
        wanted_class = self.chemical_class(text)
        if wanted_class is None:
            return ()
        above = self.index.ancestors
        return tuple(
            sorted({c.report_key for c in components if any(wanted_class in above.get(own, ()) for own in c.classes)})
        )

    def _other(self, kind: str, text: str) -> str | None:
        folded = fold(text)
        for name in (folded, *_singular(folded)):
            target = self._names.get(f"{kind}:{name}")
            if target is not None:
                return target.partition(":")[2]
        return None


def _singular(word: str) -> Iterator[str]:
    if word.endswith("ies"):
        yield word[:-3] + "y"
    if word.endswith("es"):
        yield word[:-2]
    if word.endswith("s"):
        yield word[:-1]


def _variants(text: str) -> Iterator[tuple[str, list[str]]]:
    """The text, and the text with words of form and solution taken off its ends, turned round at a comma, in the
    singular.
    """
    seen = {text}
    queue: list[tuple[str, list[str]]] = [(text, [])]
    while queue:
        current, dropped = queue.pop(0)
        yield current, dropped
        following = list(_shortened(current, dropped))
        if ", " in current:
            head, tail = current.rsplit(", ", 1)
            following.append((f"{tail} {head}", [*dropped, ""]))
        following += [(word, [*dropped, ""]) for word in _singular(current) if len(word) > 3]
        for item in following:
            if item[0] and item[0] not in seen:
                seen.add(item[0])
                queue.append(item)


def _shortened(text: str, dropped: list[str]) -> Iterator[tuple[str, list[str]]]:
    lower = text.casefold()
    for word in (*_SOLUTION_WORDS, *_FORM_WORDS):
        if word not in lower:
            continue
        end = re.search(rf"[\s,]+\(?{re.escape(word)}\)?$", lower)
        if end:
            yield text[: end.start()].rstrip(" ,"), [*dropped, word]
        start = re.match(rf"{re.escape(word)}(?:\s+of)?[\s,]+", lower)
        if start:
            yield text[start.end() :], [*dropped, word]
