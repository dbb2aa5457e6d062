"""Chemical formulas and equations: reading, composition, molar mass, balance, display.

Two readings of a charge exist. Species *tokens* of kb/ and rules/ put the number after the sign (``Hg+2``,
``SO4-2``), so that digits before a sign always count atoms (``N3-``, ``NH4+``). People also write ``Fe3+``, ``SO42-``
and ``SO4^2-``; :func:`parse_formula` resolves these, :func:`parse_token` does not.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from functools import lru_cache
from itertools import chain

from msgspec import Struct

from carboy.datafiles import data_dir
from carboy.errors import InputError
from carboy.span import Span

Atoms = Mapping[str, float]
Composition = tuple[Atoms, int]  # atoms per formula unit, charge

_SUBSCRIPTS = str.maketrans("₀₁₂₃₄₅₆₇₈₉₊₋", "0123456789+-")
_SUPERSCRIPTS = {**dict(zip("⁰¹²³⁴⁵⁶⁷⁸⁹", "0123456789", strict=True)), "⁺": "+", "⁻": "-"}
_TO_SUBSCRIPT = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
_TO_SUPERSCRIPT = str.maketrans("0123456789+-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻")
_SINGLE = {
    "−": "-",
    "–": "-",
    "‐": "-",
    "‑": "-",
    "•": "·",
    "∙": "·",
    "⋅": "·",
    "・": "·",
    "‧": "·",
    "*": "·",
    ":": "·",
}
_FRACTIONS = {"½": "0.5", "¼": "0.25", "¾": "0.75"}
_BRACKETS = {"(": ")", "[": "]", "{": "}"}

_STATE = re.compile(r"\((s|l|g|aq)\)$")
_CARET_CHARGE = re.compile(r"\^[{(]?(?:(?P<n1>\d*)(?P<s1>[+-])|(?P<s2>[+-])(?P<n2>\d*))[})]?$")
_TOKEN_CHARGE = re.compile(r"(?P<sign>[+-])(?P<n>\d*)$")
_SIGNS = re.compile(r"(\++|-+)$")
_NUMBER = re.compile(r"\d+/\d+|\d+(?:\.\d+)?")
_SYMBOL = re.compile(r"[A-Z][a-z]?")
_DOT = re.compile(r"(?P<whole>\d*)\.(?P<after>\d*)(?P<rest>[^·]*)")

# An anion of one of these elements written with a bare digit is meant as its charge: S2- is sulfide, I3- is triiodide.
_USUAL_ANION_CHARGE = {"O": 2, "S": 2, "Se": 2, "Te": 2, "P": 3, "As": 3, "Sb": 3}


class Element(Struct, frozen=True):
    """One line of kb/elements.ttl. ``weight`` is the abridged standard atomic weight, g/mol; None where there is
    none.
    """

    symbol: str
    name: str
    number: int
    weight: float | None


class Formula(Struct, frozen=True):
    """A formula that was read.

    ``atoms`` per formula unit, water of crystallisation included; ``water`` is the amount of that water, mol/mol;
    ``state`` is what stood in parentheses at the end ("s", "l", "g", "aq") or "".
    """

    text: str
    atoms: dict[str, float]
    charge: int
    water: float = 0.0
    state: str = ""

    @property
    def mass(self) -> float:
        """Molar mass, g/mol. Raises InputError for an element without a standard atomic weight."""
        return molar_mass(self.atoms)


@lru_cache(maxsize=1)
def elements() -> dict[str, Element]:
    """Symbol -> element, read line by line from kb/elements.ttl (the strict loader checks the same file as Turtle)."""
    found: dict[str, Element] = {}
    line_form = re.compile(
        r'^el:(?P<symbol>\w+) a :Element ; skos:prefLabel "(?P<name>[^"]+)" ; :atomicNumber (?P<number>\d+)'
        r"(?: ; :atomicWeight \[ :magnitude (?P<weight>[\d.]+) )?",
        re.MULTILINE,
    )
    for match in line_form.finditer((data_dir("kb") / "elements.ttl").read_text(encoding="utf-8")):
        weight = match["weight"]
        found[match["symbol"]] = Element(
            match["symbol"], match["name"], int(match["number"]), float(weight) if weight else None
        )
    return found


def molar_mass(atoms: Atoms) -> float:
    """Molar mass, g/mol, from the abridged standard atomic weights (IUPAC 2021).

    Raises InputError for a symbol that is no element or has no standard atomic weight.
    """
    total = 0.0
    for symbol, count in atoms.items():
        element = elements().get(symbol)
        if element is None:
            raise InputError(f"'{symbol}' is no element")
        if element.weight is None:
            raise InputError(f"{element.name} has no standard atomic weight, so no molar mass can be given")
        total += count * element.weight
    return total


def parse_formula(text: str, groups: Mapping[str, Atoms] | None = None) -> Formula:
    """Read a formula as people write it.

    Brackets may be nested; hydrates are joined by a middle dot, ``.``, ``*`` or ``:``; subscripts and superscripts
    may be Unicode. A charge may be ``Hg+2``, ``SO4^2-``, ``SO4²⁻``, ``Fe3+``, ``SO42-``. Where digits could be atoms
    or charge: after one cation element they are the charge (``Fe3+``), after one anion element only if that is its
    usual charge (``S2-``, but ``I3-``), of two digits the second is the charge unless they follow H or C (``SO42-``,
    ``NO3-``). ``groups`` are further symbols with their atoms. Raises InputError with the place of the fault.
    """
    return _parse(text, groups or {}, token=False)


def parse_token(text: str, groups: Mapping[str, Atoms] | None = None) -> Formula:
    """Read a species token: as :func:`parse_formula`, but the charge is a sign with its number after it, nothing else.

    ``groups`` are ligand names with their atoms (``Edta``), as in ``CuEdta-2``. Raises InputError.
    """
    return _parse(text, groups or {}, token=True)


def is_formula(text: str) -> bool:
    """Whether ``text`` can be read as a formula with its upper and lower case as they stand."""
    try:
        parse_formula(text)
    except InputError:
        return False
    return True


def hill_formula(atoms: Atoms) -> str:
    """The atoms in the order of Hill (C, H, then by alphabet; all by alphabet where there is no C): ``CHNaO3``."""
    first = ["C", "H"] if "C" in atoms else []
    order = [*(s for s in first if s in atoms), *sorted(s for s in atoms if s not in first)]
    return "".join(symbol + ("" if atoms[symbol] == 1 else f"{atoms[symbol]:g}") for symbol in order)


def plain_formula(text: str) -> str:
    """The formula with plain digits, a middle dot before water of crystallisation, without spaces; not checked."""
    plain = _normalise(text)[0].replace("^", "")
    return "·".join(_split_dots(plain))


def token_of(formula: str, charge: int) -> str:
    """The species token of a plain formula and a charge: ``SO4``, -2 -> ``SO4-2``."""
    return formula + charge_suffix(charge)


def charge_suffix(charge: int) -> str:
    """The end of a token: "", "+", "-", "+2", "-3"."""
    if charge == 0:
        return ""
    return ("+" if charge > 0 else "-") + ("" if abs(charge) == 1 else str(abs(charge)))


def split_token(token: str) -> tuple[str, int]:
    """``SO4-2`` -> (``SO4``, -2). A token without a charge at its end has charge 0."""
    match = _TOKEN_CHARGE.search(token)
    if match is None or match.start() == 0:
        return token, 0
    size = int(match["n"] or 1)
    return token[: match.start()], size if match["sign"] == "+" else -size


def as_token(text: str) -> str:
    """A formula as people write it -> its token: ``SO4^2-``, ``SO₄²⁻`` and ``SO42-`` give ``SO4-2``. Raises
    InputError.
    """
    formula = parse_formula(text)
    plain = _normalise(text)[0]
    state = _STATE.search(plain)
    core = _strip_charge(plain[: state.start()] if state else plain, token=False)[0]
    return token_of("·".join(_split_dots(core)), formula.charge) + (state.group(0) if state else "")


def pretty_formula(text: str) -> str:
    """The token or formula with subscripts and superscripts: ``SO4-2`` -> ``SO₄²⁻``. Names of other kinds are given
    back unchanged.
    """
    plain, _ = _normalise(text)
    state = _STATE.search(plain)
    body = plain[: state.start()] if state else plain
    if body in ("e-", "e^-"):
        return "e⁻"
    try:
        charge = parse_token(body).charge
        core = _strip_charge(body, token=True)[0]
    except InputError:
        core, charge = split_token(body)
        # a ligand named in a token (Edta-4) has a capital; other names only look as if they ended in a charge
        if not (charge and re.fullmatch(r"(?:[A-Z(\[][A-Za-z()\[\]]*\d*)+", core)):
            return text
    units = []
    for unit in _split_dots(core):
        coefficient = re.match(r"[\d./]*", unit)
        start = coefficient.end() if coefficient else 0
        units.append(unit[:start] + unit[start:].translate(_TO_SUBSCRIPT))
    sign = "" if charge == 0 else ("" if abs(charge) == 1 else str(abs(charge))) + ("+" if charge > 0 else "-")
    return "·".join(units) + sign.translate(_TO_SUPERSCRIPT) + (state.group(0) if state else "")


# --- equations -----------------------------------------------------------------------------------------------------


class Equation(Struct, frozen=True):
    """Both sides of a reaction: species token -> coefficient (positive)."""

    text: str
    left: dict[str, float]
    right: dict[str, float]

    @property
    def net(self) -> dict[str, float]:
        """Right minus left; a species on both sides counts once, and not at all if it cancels."""
        total = dict(self.right)
        for token, coefficient in self.left.items():
            total[token] = total.get(token, 0.0) - coefficient
        return {token: value for token, value in total.items() if value != 0}


_ARROW = re.compile(r"\s*(?:<-+>|<=+>|-+>|=+>|→|⟶|⇌|⇄|↔|=+)\s*")
_TERM = re.compile(r"(?:(?P<number>\d+/\d+|\d+(?:\.\d+)?|½)(?:\s+|(?=[A-Z(\[])))?(?P<token>\S+)$")


def parse_sum(text: str, *, file: str = "") -> dict[str, float]:
    """``2 Na+ + HS- + OH-`` -> token -> coefficient. " + " with spaces separates the terms. Raises InputError."""
    return _parse_side(text, 0, len(text), file)


def parse_equation(text: str, *, file: str = "") -> Equation:
    """Read ``Hg+2 + 2 HS- = HgS2-2 + 2 H+``; the sides may be joined by ``=``, ``->`` or a double arrow.

    Tokens are not checked here: a balance does that. Raises InputError with the place of the fault.
    """
    arrows = [match for match in _ARROW.finditer(text) if match.group(0).strip()]
    if len(arrows) != 1:
        message = "an equation needs '=' or '->' once"
        raise InputError(message, span=Span(text, 0, max(1, len(text)), file))
    arrow = arrows[0]
    return Equation(text, _parse_side(text, 0, arrow.start(), file), _parse_side(text, arrow.end(), len(text), file))


def token_composition(token: str) -> Composition:
    """Atoms and charge of a token that is a formula; ``e-`` is the electron. Raises InputError."""
    if token == "e-":
        return {}, -1
    formula = parse_token(token)
    return formula.atoms, formula.charge


def imbalance(
    net: Mapping[str, float], composition: Callable[[str], Composition] = token_composition
) -> dict[str, float]:
    """Element symbol or "charge" -> surplus on the right (mol); empty if balanced within 1e-6."""
    total: dict[str, float] = {}
    for token, coefficient in net.items():
        atoms, charge = composition(token)
        for symbol, count in chain(atoms.items(), (("charge", charge),)):
            total[symbol] = total.get(symbol, 0.0) + coefficient * count
    return {symbol: value for symbol, value in total.items() if abs(value) > 1e-6}


def check_balance(equation: Equation, composition: Callable[[str], Composition] = token_composition) -> None:
    """Raise InputError with a table of both sides if elements or charge are not balanced."""
    if not imbalance(equation.net, composition):
        return
    sides = []
    for side in (equation.left, equation.right):
        sides.append(imbalance(side, composition))
    symbols = [*dict.fromkeys(symbol for symbol in chain(*sides) if symbol != "charge"), "charge"]
    rows = [f"  {'':8}{'left':>8}{'right':>8}"]
    for symbol in symbols:
        left, right = sides[0].get(symbol, 0.0), sides[1].get(symbol, 0.0)
        mark = "" if abs(left - right) <= 1e-6 else "  <- differs"
        rows.append(f"  {symbol:8}{left:>8g}{right:>8g}{mark}")
    message = f"the equation '{equation.text}' is not balanced\n" + "\n".join(rows)
    if any(re.fullmatch(r"[A-Z][a-z]?\d[+-]", token) for token in equation.net):
        message += "\n  (the number of a charge stands after its sign: Fe+3; in Fe3+ the 3 counts atoms)"
    raise InputError(message)


def pretty_equation(text: str) -> str:
    """The equation with its formulas as :func:`pretty_formula` shows them and ⇌ or → between the sides."""
    equation = parse_equation(text)
    arrow = " → " if (">" in text and "<" not in text) or "→" in text else " ⇌ "

    def side(terms: Mapping[str, float]) -> str:
        return " + ".join(
            ("" if value == 1 else f"{value:g} ") + pretty_formula(token) for token, value in terms.items()
        )

    return side(equation.left) + arrow + side(equation.right)


def _parse_side(text: str, start: int, stop: int, file: str) -> dict[str, float]:
    terms: dict[str, float] = {}
    position = start
    for piece in re.split(r"(\s\+\s)", text[start:stop]):
        if re.fullmatch(r"\s\+\s", piece):
            position += len(piece)
            continue
        word = piece.strip()
        span = Span(
            text, position + len(piece) - len(piece.lstrip()), max(position + len(piece.rstrip()), position + 1), file
        )
        match = _TERM.fullmatch(word)
        if match is None:
            reason = (
                "a term is missing here" if not word else f"'{word}' is no term; write '2 Na+' with ' + ' between terms"
            )
            raise InputError(reason, span=span)
        number = _to_float(match["number"]) if match["number"] else 1.0
        if number <= 0:
            raise InputError("a coefficient must be above zero", span=span)
        token = match["token"]
        terms[token] = terms.get(token, 0.0) + number
        position += len(piece)
    return terms


# --- reading one formula -------------------------------------------------------------------------------------------


def _to_float(number: str) -> float:
    if number in _FRACTIONS:
        return float(_FRACTIONS[number])
    if "/" in number:
        top, bottom = number.split("/")
        return float(top) / float(bottom) if float(bottom) else 0.0
    return float(number)


def _normalise(text: str) -> tuple[str, list[int]]:
    """Plain characters, and for each the index of the character of ``text`` it came from. Spaces go; superscripts get
    a ``^``.
    """
    out: list[str] = []
    where: list[int] = []
    raised = False
    for index, char in enumerate(text):
        plain = _SINGLE.get(char, _FRACTIONS.get(char, char.translate(_SUBSCRIPTS)))
        if char in _SUPERSCRIPTS:
            plain = ("" if raised else "^") + _SUPERSCRIPTS[char]
        raised = char in _SUPERSCRIPTS
        if char.isspace():
            continue
        out.extend(plain)
        where.extend([index] * len(plain))
    return "".join(out), where


def _split_dots(text: str) -> list[str]:
    """The units of a formula with water or double salts. A ``.`` is a separator unless it is the point of a decimal
    subscript.
    """
    pieces: list[str] = []
    for part in text.split("·"):
        start = 0
        for match in re.finditer(r"\.", part):
            at = match.start()
            if at < start:
                continue
            whole = re.search(r"\d*$", part[start:at])
            after = re.match(r"\d*", part[at + 1 :])
            digits_before = whole.group(0) if whole else ""
            digits_after = after.group(0) if after else ""
            rest = part[at + 1 + len(digits_after) :]
            symbols = _SYMBOL.findall(rest)
            at_coefficient = len(digits_before) == at - start  # "0.5H2O": the point of a coefficient
            is_point = bool(digits_before and digits_after) and (
                at_coefficient or digits_before == "0" or not (rest.startswith("H2O") or len(symbols) > 1)
            )
            if not is_point:
                pieces.append(part[start:at])
                start = at + 1
        pieces.append(part[start:])
    return pieces


def _strip_charge(text: str, *, token: bool) -> tuple[str, int]:
    """The text before the charge, and the charge."""
    caret = _CARET_CHARGE.search(text)
    if caret:
        size = int(caret["n1"] or caret["n2"] or 1)
        return text[: caret.start()], size if (caret["s1"] or caret["s2"]) == "+" else -size
    explicit = _TOKEN_CHARGE.search(text)
    if explicit is None:
        return text, 0
    sign = 1 if explicit["sign"] == "+" else -1
    if explicit["n"]:
        return text[: explicit.start()], sign * int(explicit["n"])
    signs = _SIGNS.search(text)
    body = text[: signs.start()] if signs else text[: explicit.start()]
    count = len(text) - len(body)
    if count > 1 or token:
        return body, sign * count
    return _ambiguous_charge(body, sign)


def _ambiguous_charge(body: str, sign: int) -> tuple[str, int]:
    """``body`` as people write it before a single sign: its last digit may be a charge (``Fe3`` +, ``SO42`` -) or
    atoms (``NO3`` -).
    """
    single = re.fullmatch(r"(?P<symbol>[A-Z][a-z]?)(?P<count>\d?)(?P<last>\d)", body)
    if single and not single["count"]:
        last = int(single["last"])
        meant = (sign > 0 and single["symbol"] != "H") or _USUAL_ANION_CHARGE.get(single["symbol"]) == last
        return (single["symbol"], sign * last) if meant and last else (body, sign)
    end = re.search(r"(?P<before>[A-Z][a-z]?|[)\]])(?P<digits>\d{2,3})$", body)
    if end and end["before"] not in ("C", "H") and end["digits"][-1] in "1234":
        return body[:-1], sign * int(body[-1])
    bracket = re.search(r"\](\d)$", body)
    if bracket and int(bracket.group(1)):
        return body[:-1], sign * int(bracket.group(1))
    return body, sign


def _parse(text: str, groups: Mapping[str, Atoms], *, token: bool) -> Formula:
    plain, where = _normalise(text)

    def fault(message: str, at: int = 0) -> InputError:
        begin = where[min(at, len(where) - 1)] if where else 0
        return InputError(message, span=Span(text, begin, max(begin + 1, len(text) if at == 0 else begin + 1)))

    if not plain:
        raise fault("a formula is missing here")
    state = _STATE.search(plain)
    body, charge = _strip_charge(plain[: state.start()] if state else plain, token=token)
    if not body:
        raise fault(f"'{text}' is no formula")
    total: dict[str, float] = {}
    water = 0.0
    units = _split_dots(body)
    offset = 0
    for unit in units:
        number = _NUMBER.match(unit)
        if number and len(units) == 1:
            raise fault(f"'{text}' begins with a number, so it is no formula")
        start = number.end() if number else 0
        count = _to_float(number.group(0)) if number else 1.0
        atoms, end = _read_units(unit, start, "", groups, lambda message, at, base=offset: fault(message, base + at))
        if end != len(unit) or not atoms or count <= 0:
            raise fault(f"'{text}' is no formula", offset + min(end, len(unit)))
        if offset and atoms == {"H": 2.0, "O": 1.0}:
            water += count
        for symbol, value in atoms.items():
            total[symbol] = total.get(symbol, 0.0) + count * value
        offset += len(unit) + 1
    return Formula(text, total, charge, water, state.group(1) if state else "")


def _read_units(
    text: str, at: int, closing: str, groups: Mapping[str, Atoms], fault: Callable[..., InputError]
) -> tuple[dict[str, float], int]:
    """Symbols and bracketed groups from ``at`` to ``closing`` (or the end): atoms, index after what was read."""
    atoms: dict[str, float] = {}
    while at < len(text):
        char = text[at]
        if char == closing:
            return atoms, at
        if char in _BRACKETS:
            inner, end = _read_units(text, at + 1, _BRACKETS[char], groups, fault)
            if end >= len(text) or not inner:
                raise fault(f"the bracket '{char}' is not closed or is empty", at)
            at = end + 1
        else:
            name = next((g for g in sorted(groups, key=len, reverse=True) if text.startswith(g, at)), "")
            symbol = _SYMBOL.match(text, at)
            if name:
                inner, at = dict(groups[name]), at + len(name)
            elif symbol is None:
                raise fault(f"'{char}' does not belong in a formula", at)
            elif symbol.group(0) in elements():
                inner, at = {symbol.group(0): 1.0}, symbol.end()
            else:
                raise fault(f"'{symbol.group(0)}' is no element", at)
        number = _NUMBER.match(text, at)
        count = _to_float(number.group(0)) if number else 1.0
        at = number.end() if number else at
        for key, value in inner.items():
            atoms[key] = atoms.get(key, 0.0) + count * value
    return atoms, at
