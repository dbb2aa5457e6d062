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


def solids(text: str) -> dict[str, tuple[dict[str, float], float]]:
    """Name of a solid there -> our components of one mol of it and log10 of its saturation ratio where all are 1."""
    known = _formations(text)[1]
    found: dict[str, tuple[dict[str, float], float]] = {}
    for name, (left, right, log_k) in _reactions(_blocks(text, "PHASES"), named=True).items():
        total: dict[str, float] = {}
        beta = -log_k
        others = dict(list(left.items())[1:])  # the first on the left is the solid itself
        if any(token not in known for token in (*right, *others)):
            continue
        for side, sign in ((right, 1.0), (others, -1.0)):
            for token, n in side.items():
                parts, inner = known[token]
                beta += sign * n * inner
                for part, count in parts.items():
                    total[part] = total.get(part, 0.0) + sign * n * count
        found[name] = ({token: n for token, n in total.items() if abs(n) > 1e-9}, beta)
    return found


def _formations(text: str) -> tuple[dict[Make, tuple[str, float]], dict[str, tuple[dict[str, float], float]]]:
    body = _blocks(text, "SOLUTION_SPECIES")
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
    known = {name: _oxidised(parts, beta, known) for name, (parts, beta) in known.items()}
    whole = {frozenset(parts.items()): (name, beta) for name, (parts, beta) in known.items() if "e-" not in parts}
    return whole, known


def _oxidised(
    parts: dict[str, float], beta: float, known: dict[str, tuple[dict[str, float], float]]
) -> tuple[dict[str, float], float]:
    """What is formed from iron(II) with electrons set free, formed from iron(III)."""
    lost = -parts.get("e-", 0.0)
    if lost > 0 and parts.get("Fe+2", 0.0) >= lost and "Fe+3" in known:
        parts = {**parts, "Fe+2": parts["Fe+2"] - lost, "e-": 0.0, "Fe+3": parts.get("Fe+3", 0.0) + lost}
        beta -= lost * known["Fe+3"][1]
    return {token: n for token, n in parts.items() if abs(n) > 1e-9}, beta


def _blocks(text: str, keyword: str) -> str:
    """All lines below a keyword, up to the next."""
    kept, inside = [], False
    for line in text.replace(";", "\n").splitlines():
        if re.match(r"[A-Z][A-Z_]{2,}\s*(\d|#|$)", line):
            inside = line.split()[0] == keyword
        elif inside:
            kept.append(line)
    return "\n".join(kept)


def _reactions(body: str, named: bool = False) -> dict[str, tuple[dict[str, float], dict[str, float], float]]:
    found: dict[str, tuple[dict[str, float], dict[str, float], float]] = {}
    name, pending, sides, log_k = "", "", None, 0.0
    for raw in [*body.splitlines(), "end = end"]:
        line = raw.partition("#")[0].replace("=", " = ").strip()
        words = line.split()
        if "=" in words:
            if sides is not None:
                found[name or f"{len(found)}"] = (*sides, log_k)
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
