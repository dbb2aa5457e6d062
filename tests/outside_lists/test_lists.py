"""Published lists of what must not meet, line by line: the groups of 40 CFR part 264 appendix V, the substances with supplementary
hazard statements, the families of the 1980 EPA method, and the storage advice of "Prudent Practices".

Each line asks for a finding of one of its kinds, at least as grave as stated; an exception asks that nothing graver than a note is
said, because chemistry knows better than the list. The lists live here only: the product knows rules, not tables. The whole takes some
minutes, so a quarter of the lines, each time the same, is run; with CARBOY_EVERY_PAIR set in the environment, all of them. A known miss
always runs, and fails as soon as it holds.
"""

from __future__ import annotations

import os
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import pytest

from carboy.model.report import Report
from carboy.model.rule import Example
from carboy.rulebook.running import ExampleRunner
from carboy.vetting import Laboratory

HERE = Path(__file__).parent
RANK = {"note": 0, "warning": 1, "danger": 2}
KINDS = {
    *(
        "toxic-gas",
        "flammable-gas",
        "asphyxiant-gas",
        "oxygen",
        "pressure",
        "heat",
        "foam",
        "fire",
        "explosive",
        "polymerization",
    ),
    *("toxic-product", "remobilised", "incomplete", "attack"),
}
COUNTS = {"cfr264.txt": 324, "euh.txt": 96, "families.txt": 316, "storage.txt": 152}  # lines, exceptions among them
EXCEPTION, MISS = "exception:", "known miss:"
EVERY = bool(os.environ.get("CARBOY_EVERY_PAIR"))


@dataclass(frozen=True)
class Pair:
    """A line of a list. ``kinds`` is empty for an exception, whose ``reason`` is told; ``temperature`` where it is not that of the room."""

    text: str
    portions: tuple[str, ...]
    kinds: frozenset[str] = frozenset()
    least: str = ""
    formula: str = ""
    temperature: str = ""
    reason: str = ""
    known_miss: str = ""


def portions_of(text: str) -> tuple[str, ...]:
    """Split at ' + ' outside parentheses."""
    portions: list[str] = []
    for piece in text.split(" + "):
        if portions and portions[-1].count("(") > portions[-1].count(")"):
            portions[-1] += " + " + piece
        else:
            portions.append(piece)
    return tuple(portion.strip() for portion in portions)


def pair_of(line: str) -> Pair:
    """``portions | kinds | least signal | formula | 80 degC | known miss: reason``, the last three optional, or ``portions | exception: reason``."""
    first, second, *rest = (part.strip() for part in line.split("|"))
    portions = portions_of(first)
    if second.startswith(EXCEPTION):
        return Pair(line, portions, reason=second.removeprefix(EXCEPTION).strip())
    least, *others = rest
    miss = next((part for part in others if part.startswith(MISS)), "")
    temperature = next((part for part in others if part.endswith("degC")), "")
    formula = next((part for part in others if part not in (miss, temperature)), "")
    return Pair(
        line,
        portions,
        frozenset(second.split()),
        least,
        formula,
        temperature,
        known_miss=miss.removeprefix(MISS).strip(),
    )


def pairs_of(name: str) -> list[Pair]:
    read = (line.strip() for line in (HERE / name).read_text(encoding="utf-8").splitlines())
    return [pair_of(line) for line in read if line and not line.startswith("#")]


PAIRS = {name: pairs_of(name) for name in COUNTS}


def chosen() -> list[object]:
    """Every fourth line of every list, or all of them, with the known misses marked."""
    return [
        pytest.param(
            pair,
            id=f"{name}: {pair.text}",
            marks=[pytest.mark.xfail(reason=pair.known_miss, strict=True)] if pair.known_miss else [],
        )
        for name, pairs in PAIRS.items()
        for place, pair in enumerate(pairs)
        if EVERY or place % 4 == 0 or pair.known_miss
    ]


@cache
def laboratory() -> Laboratory:
    """One for each process that runs tests."""
    return Laboratory()


def outcome(pair: Pair) -> Report:
    lab = laboratory()
    if pair.temperature:
        setting = {"temperature": pair.temperature}
        return lab.vet(ExampleRunner(lab).case(Example(pair.text, pair.portions, setting)))
    return lab.combine(pair.portions)


def told(report: Report) -> str:
    return "\n".join(f"{one.signal} {one.kind} {one.order} {one.rule}: {one.summary}" for one in report.findings)


@pytest.mark.parametrize("name", COUNTS)
def test_list_is_whole(name: str) -> None:
    pairs = PAIRS[name]
    assert len(pairs) == COUNTS[name]
    assert len({pair.text for pair in pairs}) == len(pairs)
    assert all(len(pair.portions) >= 2 for pair in pairs)
    for pair in pairs:
        assert pair.reason or (pair.kinds and pair.kinds <= KINDS and pair.least in RANK), pair.text


def test_every_list_on_disk_is_run() -> None:
    assert {path.name for path in HERE.glob("*.txt")} == set(COUNTS)


@pytest.mark.parametrize("pair", chosen())
def test_listed_pair(pair: Pair) -> None:
    report = outcome(pair)
    assert not report.unrecognised
    if pair.reason:
        assert not [one for one in report.findings if RANK[one.signal] > RANK["note"]], told(report)
        return
    assert [
        one
        for one in report.findings
        if one.kind in pair.kinds
        and RANK[one.signal] >= RANK[pair.least]
        and (not pair.formula or pair.formula in one.species)
    ], told(report) or "nothing was found"
