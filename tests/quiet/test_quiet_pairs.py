"""Everyday combinations that must stay quiet, and those that must alarm: each line of the two lists beside this file.

Quiet means no finding above a note, in either order of pouring, and nothing unrecognised. Loud means a finding of the stated kind, at
least as grave as stated, with the stated species where there is one.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import pytest

from carboy.model.report import Finding, Report
from carboy.model.rule import Example
from carboy.rulebook.running import ExampleRunner
from carboy.vetting import Laboratory

HERE = Path(__file__).parent
RANK = {"note": 0, "warning": 1, "danger": 2}
LEAST_QUIET, LEAST_LOUD = 300, 110  # lines that the lists must hold; growing them is welcome, thinning them is not


@dataclass(frozen=True)
class Loud:
    """A line of the list of alarms; ``setting`` is ``wait`` or ``temperature`` where it needs one."""

    text: str
    portions: tuple[str, ...]
    kind: str
    least: str
    formula: str
    setting: tuple[tuple[str, str], ...]


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


def loud_of(line: str) -> Loud:
    """``portions | kind | least signal | formula | wait 24 h`` with the last two optional."""
    portions, kind, least, *rest = (part.strip() for part in line.split("|"))
    formula, setting = "", []
    for part in rest:
        if part.startswith("wait "):
            setting.append(("wait", part.removeprefix("wait ")))
        elif part.endswith("degC"):
            setting.append(("temperature", part))
        else:
            formula = part
    return Loud(line, portions_of(portions), kind, least, formula, tuple(setting))


QUIET = lines_of("pairs.txt")
LOUD = [loud_of(line) for line in lines_of("loud.txt")]


@pytest.fixture(scope="module")
def lab() -> Laboratory:
    return Laboratory()


def alarms(report: Report) -> list[Finding]:
    return [finding for finding in report.findings if RANK[finding.signal] > 0]


def told(findings: list[Finding]) -> str:
    return "\n".join(f"{one.signal} {one.kind} {one.order} {one.rule}: {one.summary}" for one in findings)


def test_lists_are_whole() -> None:
    assert len(QUIET) >= LEAST_QUIET
    assert len(set(QUIET)) == len(QUIET)
    assert len(LOUD) >= LEAST_LOUD
    assert len({one.text for one in LOUD}) == len(LOUD)
    assert all(len(portions_of(line)) >= 2 for line in QUIET)
    assert all(one.least in ("warning", "danger") for one in LOUD)
    assert not set(QUIET) & {one.text.split("|")[0].strip() for one in LOUD}


@pytest.mark.parametrize("line", QUIET)
def test_harmless_pair_is_quiet(lab: Laboratory, line: str) -> None:
    report = lab.combine(portions_of(line))
    assert not report.unrecognised
    assert not alarms(report), told(alarms(report))


@pytest.mark.parametrize("one", LOUD, ids=lambda one: one.text)
def test_dangerous_pair_alarms(lab: Laboratory, one: Loud) -> None:
    if one.setting:
        report = lab.vet(ExampleRunner(lab).case(Example(one.text, one.portions, dict(one.setting))))
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
