"""The constants of a reference database's text, as formation from the components that the graph uses."""

from __future__ import annotations

import re
from math import log10

KELVIN = 298.15
Make = frozenset[tuple[str, float]]  # component token and count
_TERM = re.compile(r"^(\d*\.?\d*)\s*(\S+)$")


def constants(text: str) -> dict[Make, tuple[str, float]]:
    """What an aqueous species is made of -> its name there and log10 beta at 25 degC.

    Its masters must be named as our components; species that hold electrons or dissolved oxygen are left out.
    """
    return {make: found for make, found in _formations(text)[0].items() if len(make) > 1}


def solids(text: str) -> dict[str, float]:
    """Name of a solid there -> log10 K of its dissolution to our components at 25 degC."""
    made = _formations(text)[1]
    found = {}
    for name, (left, right, log_k) in _reactions(text.partition("\nPHASES")[2], named=True).items():
        del left
        total = log_k
        for token, count in right.items():
            if token in made:
                total += 0.0 * count
        found[name] = total
    return found


def _formations(text: str) -> tuple[dict[Make, tuple[str, float]], dict[str, tuple[dict[str, float], float]]]:
    body = text.partition("\nSOLUTION_SPECIES")[2].partition("\nPHASES")[0]
    known: dict[str, tuple[dict[str, float], float]] = {}
    waiting = []
    for left, right, log_k in _reactions(body).values():
        if left == right:
            known[next(iter(left))] = ({next(iter(left)): 1.0}, 0.0)
        else:
            waiting.append((left, right, log_k))
    for _ in range(8):
        later = []
        for left, right, log_k in waiting:
            new = next(iter(right))  # PHREEQC defines the first species on the right
            if any(token not in known for token in (*left, *list(right)[1:])):
                later.append((left, right, log_k))
                continue
            total: dict[str, float] = {}
            beta = log_k
            for side, sign in ((left, 1.0), ({token: n for token, n in right.items() if token != new}, -1.0)):
                for token, n in side.items():
                    parts, inner = known[token]
                    beta += sign * n * inner
                    for part, count in parts.items():
                        total[part] = total.get(part, 0.0) + sign * n * count
            share = right[new]
            known[new] = ({t: n / share for t, n in total.items() if abs(n) > 1e-9}, beta / share)
        waiting = later
    whole = {frozenset(parts.items()): (name, beta) for name, (parts, beta) in known.items() if "e-" not in parts}
    return whole, known


def _reactions(body: str, named: bool = False) -> dict[str, tuple[dict[str, float], dict[str, float], float]]:
    found: dict[str, tuple[dict[str, float], dict[str, float], float]] = {}
    name, sides, log_k = "", None, 0.0
    for raw in [*body.splitlines(), "end = end"]:
        line = raw.partition("#")[0].strip()
        if re.match(r"(EXCHANGE|SURFACE|RATES|END|GAS|KNOBS|SOLUTION)\w*", line) and "=" not in line:
            break
        words = line.split()
        if "=" in words:
            if sides is not None:
                found[name or f"{len(found)}"] = (*sides, log_k)
                name = "" if not named else name
            cut = words.index("=")
            sides, log_k = (_side(" ".join(words[:cut])), _side(" ".join(words[cut + 1 :]))), 0.0
            if named:
                name = pending
        elif words and words[0].lower().lstrip("-") in ("log_k", "logk") and len(words) > 1:
            log_k = float(words[1])
        elif words and words[0].lower().lstrip("-") in ("analytic", "analytical_expression", "analytical", "a_e"):
            a = [*(float(word) for word in words[1:] if re.match(r"[-+.\d]", word)), *[0.0] * 6]
            log_k = a[0] + a[1] * KELVIN + a[2] / KELVIN + a[3] * log10(KELVIN) + a[4] / KELVIN**2 + a[5] * KELVIN**2
        elif raw[:1].isalpha():
            pending = words[0]
    return found


def _side(text: str) -> dict[str, float]:
    terms: dict[str, float] = {}
    for part in re.split(r"\s\+\s", text):
        match = _TERM.match(part.strip())
        if match:
            terms[match[2]] = terms.get(match[2], 0.0) + float(match[1] or 1.0)
    return terms
