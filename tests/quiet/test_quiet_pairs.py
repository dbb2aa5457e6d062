"""Everyday combinations that must stay quiet, and those that must alarm: each line of the two lists beside this file.

Quiet means no finding above a note, in either order of pouring, and nothing unrecognised. Loud means a finding of the
stated kind, at least as grave as stated, with the stated species where there is one. A quarter of the quiet and half of
the loud lines are run each time; with CARBOY_EVERY_PAIR set in the environment, all of them.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import pytest

from carboy.model.report import Finding, Report
from carboy.model.rule import Example
from carboy.rulebook.running import ExampleRunner
from carboy.vetting import Laboratory

HERE = Path(__file__).parent
RANK = {"note": 0, "warning": 1, "danger": 2}
LEAST_QUIET, LEAST_LOUD = 340, 120  # lines that the lists must hold: they may grow
MISS = "known miss:"
EVERY = bool(os.environ.get("CARBOY_EVERY_PAIR"))


@dataclass(frozen=True)
class Quiet:
    """A line of the list of harmless combinations; ``known_miss`` tells why it is not yet quiet."""

    text: str
    portions: tuple[str, ...]
    known_miss: str


@dataclass(frozen=True)
class Loud:
    """A line of the list of alarms; ``temperature`` where it needs another than that of the room, ``known_miss`` as above."""

    text: str
    portions: tuple[str, ...]
    kind: str
    least: str
    formula: str
    temperature: str
    known_miss: str


def lines_of(name: str) -> list[str]:
    """The lines of a list without headings."""
    read = (line.strip() for line in (HERE / name).read_text(encoding="utf-8").splitlines())
    return [line for line in read if line and not line.startswith("#")]


def portions_of(text: str) -> tuple[str, ...]:
    """Split at ' + ' outside parentheses."""
    portions: list[str] = []
    for piece in text.split(" + "):
        if portions and portions[-1].count("(") > portions[-1].count(")"):
            portions[-1] += " + " + piece
        else:
            portions.append(piece)
    return tuple(portion.strip() for portion in portions)


def quiet_of(line: str) -> Quiet:
    """``portions`` or ``portions | known miss: reason``."""
    portions, _, reason = line.partition(" | ")
    return Quiet(portions, portions_of(portions), reason.removeprefix(MISS).strip())


def loud_of(line: str) -> Loud:
    """``portions | kind | least signal | formula | 80 degC | known miss: reason`` with the last three optional."""
    portions, kind, least, *rest = (part.strip() for part in line.split("|"))
    temperature = next((part for part in rest if part.endswith("degC")), "")
    miss = next((part for part in rest if part.startswith(MISS)), "")
    formula = next((part for part in rest if part not in (temperature, miss)), "")
    return Loud(line, portions_of(portions), kind, least, formula, temperature, miss.removeprefix(MISS).strip())


QUIET = [quiet_of(line) for line in lines_of("pairs.txt")]
LOUD = [loud_of(line) for line in lines_of("loud.txt")]


def chosen(lines: Sequence[Quiet] | Sequence[Loud], step: int) -> list[object]:
    """Every ``step``-th line, or all of them, with the known misses marked; a known miss always runs."""
    return [
        pytest.param(
            one, id=one.text, marks=[pytest.mark.xfail(reason=one.known_miss, strict=True)] if one.known_miss else []
        )
        for place, one in enumerate(lines)
        if EVERY or place % step == 0 or one.known_miss
    ]


@pytest.fixture(scope="module")
def lab() -> Laboratory:
    return Laboratory()


def alarms(report: Report) -> list[Finding]:
    return [finding for finding in report.findings if RANK[finding.signal] > 0]


def told(findings: list[Finding]) -> str:
    return "\n".join(f"{one.signal} {one.kind} {one.order} {one.rule}: {one.summary}" for one in findings)


def test_lists_are_whole() -> None:
    assert len(QUIET) >= LEAST_QUIET
    assert len({one.text for one in QUIET}) == len(QUIET)
    assert len(LOUD) >= LEAST_LOUD
    assert len({one.text for one in LOUD}) == len(LOUD)
    assert all(len(one.portions) >= 2 for one in (*QUIET, *LOUD))
    assert all(one.least in ("warning", "danger") for one in LOUD)
    assert not {one.portions for one in QUIET} & {one.portions for one in LOUD}


@pytest.mark.parametrize("one", chosen(QUIET, 4))
def test_harmless_combination_is_quiet(lab: Laboratory, one: Quiet) -> None:
    report = lab.combine(one.portions)
    assert not report.unrecognised
    assert not alarms(report), told(alarms(report))


@pytest.mark.parametrize("one", chosen(LOUD, 2))
def test_dangerous_combination_alarms(lab: Laboratory, one: Loud) -> None:
    if one.temperature:
        setting = {"temperature": one.temperature}
        report = lab.vet(ExampleRunner(lab).case(Example(one.text, one.portions, setting)))
    else:
        report = lab.combine(one.portions)
    found = [
        finding
        for finding in report.findings
        if finding.kind == one.kind
        and RANK[finding.signal] >= RANK[one.least]
        and (not one.formula or one.formula in finding.species)
    ]
    assert found, told(report.findings) or "nothing was found"
    assert report.verdict in ("refuse", "conditional")
